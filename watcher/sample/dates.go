package sample

import (
	"cmp"
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
)

// style is one way to write dates: as the configuration names it, and as package time does.
type style struct{ text, layout string }

const excel = "excel"

// allStyles are the ways that are looked for: the orders that are in use, with each mark between, and serial days.
func allStyles() (all []style) {
	layouts := strings.NewReplacer("YYYY", "2006", "YY", "06", "MMM", "Jan", "MM", "01", "DD", "02")
	for _, mark := range []string{"-", "/", ".", " ", ""} {
		for _, order := range []string{"YYYY MM DD", "DD MM YYYY", "MM DD YYYY", "DD MMM YYYY", "YYYY MMM DD", "MMM DD YYYY", "DD MM YY", "MM DD YY",
			"YY MM DD", "DD MMM YY"} {
			text := strings.ReplaceAll(order, " ", mark)
			all = append(all, style{text, layouts.Replace(text)})
		}
	}
	return append(all, style{text: excel})
}

// read is the date of a cell. Serial days are those of the 1900 system (45292 is 2024-01-01).
func (s style) read(cell string) (rules.Date, bool) {
	if s.text == excel {
		n, err := strconv.Atoi(cell)
		return rules.Date(n - 25569), err == nil && len(cell) == 5
	}
	if len(cell) != len(s.layout) {
		return rules.NoDate, false
	}
	t, err := time.Parse(s.layout, cell)
	return rules.DateFrom(t), err == nil
}

// bare says that nothing but digits is written, so that other numbers look the same.
func (s style) bare() bool {
	return s.text == excel || !strings.ContainsAny(s.text, "-/. ") && !strings.Contains(s.text, "MMM")
}

// aDate says whether a text is a date with marks in it.
func aDate(text string) bool {
	return slices.ContainsFunc(allStyles(), func(s style) bool {
		_, ok := s.read(text)
		return ok && !s.bare()
	})
}

// trial is a style held against the cells of a column.
type trial struct {
	style
	misses   int
	fell     place // the first cell that it cannot read
	after    int   // cells read before it
	weekends int
	descents int // dates that lie before the one above them
	last     rules.Date
	seen     map[string]rules.Date
}

// tries holds every style against the cells. The calendar's limits are 1970 and newest, a day on.
func tries(cells []place, newest rules.Date) []*trial {
	var live []*trial
	for _, s := range allStyles() {
		t := &trial{style: s, seen: map[string]rules.Date{}, last: rules.NoDate}
		for i, c := range cells {
			t.cell(i, c, newest)
			if t.misses > 5 && t.misses > i/10 {
				break
			}
		}
		if t.misses*50 <= len(cells) && t.misses < len(cells) {
			live = append(live, t)
		}
	}
	return live
}

func (t *trial) cell(i int, c place, newest rules.Date) {
	d, known := t.seen[c.cell]
	if !known {
		var ok bool
		if d, ok = t.read(c.cell); !ok || d < 0 || d > newest+1 {
			if t.misses++; t.misses == 1 {
				t.fell, t.after = c, i
			}
			return
		}
		t.seen[c.cell] = d
		if w := d.Weekday(); w == time.Saturday || w == time.Sunday {
			t.weekends++
		}
	}
	if d < t.last {
		t.descents++
	}
	t.last = d
}

// dates finds the column of the dates and how they are written, and gives the column's index.
func (f *Finding) dates(t *table, newest rules.Date) (at int, err error) {
	at, points := -1, 0
	var best []*trial
	for i, c := range t.columns {
		live := tries(c.filled(), newest)
		if len(live) == 0 {
			continue
		}
		p := 1
		if !live[0].bare() {
			p += 2
		}
		if c.hinted("date", "datum", "fecha", "valuation", "as of", "as_of", "asof", "day") && !strings.EqualFold(c.name, "days") {
			p += 4
		}
		if p > points && (p > 1 || !c.number.fractions) {
			at, points, best = i, p, live
		}
	}
	if at < 0 {
		return at, noDates(t)
	}
	c := t.columns[at]
	c.kind, t.date = isDate, at
	r := Remark{Key: "date", Sure: Sure}
	chosen := f.choose(t, &r, c, best, newest)
	f.Feed.DateStyle = chosen.text
	f.Feed.Columns.Date = c.name
	f.Remarks = append(f.Remarks, r)
	return at, nil
}

func noDates(t *table) error {
	first := t.samples[0]
	reason := "no column holds dates that strayd reads: day, month and year with leading zeros, such as 2026-03-09, 09/03/2026, 09-Mar-2026, or serial days"
	for _, c := range t.columns {
		if len(c.cells) > 0 && c.hinted("date", "datum", "fecha") {
			return &Unreadable{first.Name, c.cells[0].line, fmt.Sprintf("%s; column %q holds %q", reason, c.name, c.cells[0].cell)}
		}
	}
	return &Unreadable{first.Name, 0, reason}
}

// choose takes the style that reads every cell, and says what decides; where several do, the one with more business days in it.
func (f *Finding) choose(t *table, r *Remark, c *column, live []*trial, newest rules.Date) *trial {
	slices.SortStableFunc(live, func(a, b *trial) int {
		return cmp.Or(cmp.Compare(a.misses, b.misses), cmp.Compare(a.weekends, b.weekends), cmp.Compare(a.descents, b.descents))
	})
	best, rivals := live[0], []*trial{}
	for _, o := range live[1:] {
		if o.misses == best.misses {
			rivals = append(rivals, o)
		}
	}
	switch fallen := nearest(c.filled(), best, newest); {
	case t.samples[0].Typed && best.text == "YYYY-MM-DD":
		r.Why = "the cells are dates"
	case len(rivals) > 0:
		f.ambiguous(t, r, c, best, rivals)
	case fallen != nil:
		r.Why = fmt.Sprintf("%s decides: as %s it would be %s", fallen.fell.in(t.samples), fallen.text, fallen.wouldBe())
	default:
		r.Why = fmt.Sprintf("every date of column %q is written so, and can be written no other way", c.name)
	}
	if best.misses > 0 {
		r.Sure, r.Confirm = Likely, true
		r.Why += fmt.Sprintf("; %d cells are no such dates, the first: %s", best.misses, strings.TrimSuffix(best.fell.in(t.samples), ","))
	}
	return best
}

// wouldBe says what the first cell that a style cannot take would be by it.
func (t *trial) wouldBe() string {
	d, ok := t.read(t.fell.cell)
	switch {
	case !ok:
		return "no date"
	case d < 0:
		return d.Day() + ", before 1970"
	}
	return d.Day() + ", which is still to come"
}

// nearest is the style of the same length that reads the most cells before it falls: the one that a person would take it for.
func nearest(cells []place, best *trial, newest rules.Date) (near *trial) {
	for _, s := range allStyles() {
		if s.text == best.text || len(s.layout) != len(best.layout) || s.text == excel {
			continue
		}
		t := &trial{style: s, seen: map[string]rules.Date{}, last: rules.NoDate}
		for i, c := range cells {
			if t.cell(i, c, newest); t.misses > 0 {
				break
			}
		}
		if t.misses > 0 && (t.after > 0 || s.text == exchanged(best.text)) && (near == nil || t.after > near.after) {
			near = t
		}
	}
	return near
}

// exchanged is a style with day and month the other way round.
func exchanged(text string) string {
	return strings.NewReplacer("MMM", "MMM", "MM", "DD", "DD", "MM").Replace(text)
}

// ambiguous says that no line decides, what speaks for the choice, and what the other would mean.
func (f *Finding) ambiguous(t *table, r *Remark, c *column, best *trial, rivals []*trial) {
	r.Confirm, r.Sure = true, Guess
	other := rivals[0]
	first := c.filled()[0]
	a, _ := best.read(first.cell)
	b, _ := other.read(first.cell)
	r.Why = fmt.Sprintf("no line decides between %s and %s: %q is %s or %s", best.text, other.text, first.cell, a.Day(), b.Day())
	if named := nameDate(t.samples[len(t.samples)-1].Name); named != rules.NoDate {
		if best.newestOf(t) != named && other.newestOf(t) == named {
			*best, *other = *other, *best
		}
		if best.newestOf(t) == named {
			r.Sure = Likely
			r.Why += fmt.Sprintf("; the file's name says %s, as %s does", named, best.text)
			return
		}
	}
	if other.weekends > best.weekends {
		r.Sure = Likely
		r.Why += fmt.Sprintf("; as %s %d of %d dates fall on a weekend, as %s %d", other.text, other.weekends, len(other.seen), best.text, best.weekends)
	}
}

// newestOf is the newest date of the last sample.
func (t *trial) newestOf(all *table) rules.Date {
	newest := rules.NoDate
	for _, c := range all.columns[all.date].cells {
		if d, ok := t.seen[c.cell]; ok && c.sample == all.samples[len(all.samples)-1] {
			newest = max(newest, d)
		}
	}
	return newest
}

var inName = regexp.MustCompile(`(?:^|[^0-9])((?:19|20)[0-9]{2})[-_.]?([0-9]{2})[-_.]?([0-9]{2})(?:[^0-9]|$)`)

// nameDate is the date in a file's name, NoDate when there is none.
func nameDate(name string) rules.Date {
	m := inName.FindStringSubmatch(name)
	if m == nil {
		return rules.NoDate
	}
	d, err := rules.ParseDate(m[1] + "-" + m[2] + "-" + m[3])
	if err != nil {
		return rules.NoDate
	}
	return d
}
