package feed

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"strayd/rules"
)

var (
	registerColumns = []string{"series", "name", "group", "reference", "fx", "calendar", "start", "end", "owner"}
	eventColumns    = []string{"date", "series", "kind", "amount"}
)

// ReadRegister reads the register of series: comma-separated UTF-8 with the columns series, name, group, reference, fx, calendar,
// start, end and owner in any order, of which only series must be there; blank where not known. Errors: a *watcher.BadFile when
// the content is wrong, else what went wrong in reading.
func ReadRegister(path string) ([]rules.Series, error) {
	t, err := readTable(path, registerColumns, registerColumns[:1])
	if err != nil {
		return nil, err
	}
	var all []rules.Series
	lines := map[string]uint32{}
	for t.next() {
		s := rules.Series{ID: t.name("series"), Name: t.get("name"), Group: t.get("group"), Reference: t.get("reference"), FX: t.get("fx"),
			Calendar: t.get("calendar"), Owner: t.get("owner"), Start: t.date("start"), End: t.date("end")}
		if before, ok := lines[s.ID]; ok {
			t.fail("series", fmt.Sprintf("the series stands on line %d already", before))
		}
		if s.End != rules.NoDate && s.End < s.Start {
			t.fail("end", "the end lies before the start")
		}
		lines[s.ID] = t.line
		all = append(all, s)
	}
	return all, t.err()
}

// ReadEvents reads the file of known events: comma-separated UTF-8 with the columns date, series, kind and amount in any order.
// A distribution's amount is the fraction of the net asset value before it, a split's the new units for an old one. Errors as
// of ReadRegister.
func ReadEvents(path string) ([]rules.Event, error) {
	t, err := readTable(path, eventColumns, eventColumns)
	if err != nil {
		return nil, err
	}
	var all []rules.Event
	for t.next() {
		e := rules.Event{Date: t.date("date"), Series: t.name("series"), Kind: t.get("kind"), Amount: t.amount("amount")}
		switch {
		case e.Date == rules.NoDate:
			t.fail("date", "the date is empty")
		case e.Kind != "distribution" && e.Kind != "split":
			t.fail("kind", "the kind is neither distribution nor split")
		case e.Amount <= 0:
			t.fail("amount", "the amount must be above zero")
		case e.Kind == "distribution" && e.Amount >= 1:
			t.fail("amount", "a distribution is a fraction of the net asset value and lies below 1")
		}
		all = append(all, e)
	}
	return all, t.err()
}

// name reads the name of a series.
func (t *table) name(column string) string {
	s := t.get(column)
	if problem := t.plan.badName([]byte(s)); problem != "" {
		t.fail(column, problem)
	}
	return s
}

// date reads an ISO date, NoDate when the cell is empty.
func (t *table) date(column string) rules.Date {
	s := t.get(column)
	if s == "" {
		return rules.NoDate
	}
	d, problem := t.plan.style.date([]byte(s))
	if problem != "" {
		t.fail(column, problem)
	}
	return d
}

// amount reads a plain or exponent decimal.
func (t *table) amount(column string) float64 {
	s := t.get(column)
	if _, _, why := t.plan.exact([]byte(s)); why != numberGood {
		t.fail(column, t.plan.whyNot([]byte(s), why))
		return 0
	}
	v, _ := strconv.ParseFloat(s, 64)
	return v
}

// checkHeader wants every required column, and none that is unknown: a misspelt one would be lost in silence.
func checkHeader(cells []headerCell, known, required []string) *fault {
	for _, c := range cells {
		if !slices.Contains(known, string(c.name)) {
			return c.bad("unknown column; known are " + strings.Join(known, ", "))
		}
	}
	for _, name := range required {
		if columnNamed(cells, name) < 0 {
			return noColumn(cells, name)
		}
	}
	return repeated(cells, false)
}
