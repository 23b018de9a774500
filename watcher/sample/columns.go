package sample

import (
	"fmt"
	"slices"
	"strings"

	"strayd/rules"
)

// kind is what a column holds.
type kind uint8

const (
	isText kind = iota
	isNumber
	isDate
	isEmpty
)

// numbers is what a column looks like as one of numbers.
type numbers struct {
	dot, comma int            // cells that are a number with this decimal mark
	fractions  bool           // some have a decimal mark
	others     map[string]int // cells that are none, by their text
}

// mostOthers is how many different texts a column of numbers may hold beside them.
const mostOthers = 12

// look tells texts from numbers.
func (c *column) look() {
	n := &c.number
	n.others = map[string]int{}
	filled := 0
	for _, p := range c.cells {
		dot, comma := number(p.cell, '.'), number(p.cell, ',')
		if dot {
			n.dot++
		}
		if comma {
			n.comma++
		}
		n.fractions = n.fractions || (dot || comma) && strings.ContainsAny(p.cell, ".,")
		if p.cell != "" {
			filled++
		}
		if !dot && !comma && len(n.others) <= mostOthers {
			n.others[p.cell]++
		}
	}
	switch good := max(n.dot, n.comma); {
	case filled == 0:
		c.kind = isEmpty
	case 2*good > filled && len(n.others) <= mostOthers:
		c.kind = isNumber
	}
}

// filled are the cells with something in them.
func (c *column) filled() []place {
	return slices.DeleteFunc(slices.Clone(c.cells), func(p place) bool { return p.cell == "" })
}

// number says whether a cell is a number: sign, digits, mark, digits, exponent.
func number(cell string, mark byte) bool {
	cell = strings.TrimLeft(cell, "+-")
	cell, exponent, has := strings.Cut(strings.ToLower(cell), "e")
	if has && !digits(strings.TrimLeft(exponent, "+-")) {
		return false
	}
	whole, fraction, has := strings.Cut(cell, string(rune(mark)))
	return digits(whole) && (!has || digits(fraction))
}

func digits(s string) bool { return s != "" && strings.Trim(s, "0123456789") == "" }

// Words in the names of columns, in the languages of those who send files.
var (
	seriesWords = []string{"series", "isin", "fund", "portfolio", "account", "mandate", "ticker", "symbol", "identifier", "code", "id", "class", "index",
		"name", "fonds", "desk"}
	returnWords = []string{"return", "ret", "perf", "rendite", "change", "chg", "twr", "pct", "percent", "%", "bps"}
	priceWords  = []string{"price", "nav", "level", "close", "px", "kurs", "quote", "unit value", "preis"}
)

// layout tells long from wide, and names the columns.
func (f *Finding) layout(t *table, at int) error {
	var texts, values []int
	for i, c := range t.columns {
		switch {
		case i == at || c.kind == isDate:
		case c.kind == isText:
			texts = append(texts, i)
		case c.kind == isNumber:
			values = append(values, i)
		}
	}
	status := f.extras(t, &texts, &values)
	series := keyed(t, texts)
	if series < 0 && (len(texts) > 0 || repeats(t, []int{at})) {
		if series = keyed(t, values); series >= 0 {
			values = slices.DeleteFunc(values, func(i int) bool { return i == series })
		}
	}
	switch {
	case len(values) == 0:
		return noNumbers(t, at)
	case series >= 0:
		f.long(t, series, values, status)
	case len(texts) > 0:
		return &Unreadable{t.samples[0].Name, t.samples[0].Line,
			fmt.Sprintf("rows are not told apart by date and one other column, so that this is neither long nor wide; the header is %q", t.header)}
	case repeats(t, []int{at}):
		return &Unreadable{t.samples[0].Name, t.samples[0].Line, "several rows have the same date, and no column tells them apart"}
	default:
		f.wide(t, values)
	}
	return nil
}

// noNumbers says what stands where numbers might be meant.
func noNumbers(t *table, dates int) error {
	u := &Unreadable{t.samples[0].Name, t.samples[0].Line, fmt.Sprintf("no column holds bare numbers beside the dates; the header is %q", t.header)}
	for i, c := range t.columns {
		cells := c.filled()
		if i != dates && len(cells) > 0 && c.hinted(append(returnWords, append(priceWords, "value")...)...) {
			u.Line, u.Reason = cells[0].line, fmt.Sprintf("no column holds bare numbers beside the dates; column %q holds %q: ask for it without sign of unit, "+
				"brackets or marks between thousands", c.name, cells[0].cell)
		}
	}
	return u
}

// extras takes the columns of status and days out of the lists; a long file may have them.
func (f *Finding) extras(t *table, texts, values *[]int) (columns rules.Columns) {
	*texts = slices.DeleteFunc(*texts, func(i int) bool {
		c := t.columns[i]
		if !c.only("estimate", "final") {
			return false
		}
		columns.Status = c.name
		return true
	})
	*values = slices.DeleteFunc(*values, func(i int) bool {
		c := t.columns[i]
		if !strings.EqualFold(c.name, "days") || c.number.fractions || len(c.number.others) > 0 {
			return false
		}
		columns.Days = c.name
		return true
	})
	return columns
}

// only says whether every cell of a column is one of the words.
func (c *column) only(words ...string) bool {
	return !slices.ContainsFunc(c.cells, func(p place) bool { return !slices.Contains(words, p.cell) })
}

// keyed is the column that tells apart the rows of a date, preferably one that is named so; -1 for none.
func keyed(t *table, among []int) int {
	best, points := -1, -1
	for n, i := range among {
		c := t.columns[i]
		if repeats(t, []int{t.date, i}) || c.number.fractions || len(c.filled()) < len(c.cells) {
			continue
		}
		p := -n
		for w, word := range seriesWords {
			if c.hinted(word) {
				p += 100 * (len(seriesWords) - w)
				break
			}
		}
		if best < 0 || p > points {
			best, points = i, p
		}
	}
	return best
}

// repeats says whether two rows of one sample have the same cells in these columns. Less than one in a hundred is a fault of the data.
func repeats(t *table, in []int) bool {
	twice, rows := 0, 0
	for _, s := range t.samples {
		seen := map[string]bool{}
		for _, r := range s.Rows {
			key := ""
			for _, i := range in {
				if i < len(r.Cells) {
					key += r.Cells[i] + "\x00"
				}
			}
			if rows++; seen[key] {
				twice++
			}
			seen[key] = true
		}
	}
	return twice*100 > rows
}

func (f *Finding) long(t *table, series int, values []int, extra rules.Columns) {
	f.Feed.Layout = rules.Long
	c := t.columns[series]
	t.series = series
	value := valueColumn(t, values)
	t.value = []int{value}
	extra.Date, extra.Series, extra.Value = f.Feed.Columns.Date, c.name, t.columns[value].name
	f.Feed.Columns = extra
	f.say(Remark{Key: "layout", Sure: Sure, Why: fmt.Sprintf("one row an observation: dates in %q, texts that tell the rows of a date apart in %q", extra.Date, c.name)})
	r := Remark{Key: "columns", Sure: Sure, Why: fmt.Sprintf("%q is the only column of numbers", extra.Value)}
	if !c.hinted(seriesWords...) {
		r.Sure, r.Confirm = Likely, true
		r.Why += fmt.Sprintf("; that %q names the series is read from its cells", c.name)
	}
	if len(values) > 1 {
		r.Sure, r.Confirm = Likely, true
		var rest []string
		for _, i := range values {
			if i != value {
				rest = append(rest, t.columns[i].name)
			}
		}
		r.Why = fmt.Sprintf("there are other columns of numbers: %q", rest)
		if !t.columns[value].hinted(append(returnWords, priceWords...)...) {
			r.Sure = Guess
		}
	}
	f.say(r)
}

// valueColumn takes the column that is named as returns are, else as prices are, else the first.
func valueColumn(t *table, values []int) int {
	for _, words := range [][]string{returnWords, priceWords, {"value"}} {
		for _, i := range values {
			if t.columns[i].hinted(words...) {
				return i
			}
		}
	}
	return values[0]
}

func (f *Finding) wide(t *table, values []int) {
	f.Feed.Layout = rules.Wide
	t.value = values
	r := Remark{Key: "layout", Sure: Sure, Why: fmt.Sprintf("one row a date, and numbers in the other %s", rules.Counted(len(values), "column"))}
	if len(values) < 3 {
		r.Sure, r.Confirm = Likely, true
		r.Why += "; so the names of the columns are the names of the series"
	}
	f.say(r)
	f.say(Remark{Key: "columns", Sure: Sure, Why: fmt.Sprintf("dates stand in %q; every other column is a series", f.Feed.Columns.Date)})
}

// say adds a remark, in front of the one on dates, which was found first.
func (f *Finding) say(r Remark) {
	at := slices.IndexFunc(f.Remarks, func(r Remark) bool { return r.Key == "date" })
	f.Remarks = slices.Insert(f.Remarks, at, r)
}
