package weekly

import (
	"math"
	"strconv"
	"time"

	"strayd/notify"
	"strayd/rules"
)

// page is the whole log.
type page struct {
	Week     string // 2026-W11
	Dates    string
	Head     []string // lines under the title
	Word     string
	Sentence string
	First    []figure // of the sections, for the first page
	Sections []*section
	Drawings []drawing
	Cautions []string
}

// section is one part of the log.
type section struct {
	Key     string // in CSV
	Title   string
	Figures []figure
	Tables  []table
	Notes   []string
}

// figure is one labelled value.
type figure struct {
	Label string
	Cell  cell
	first bool // on the first page too
}

// table is a list with a subject a row.
type table struct {
	Key   string // in CSV, after the section's
	Title string
	Head  []string // the subject's column first
	Rows  []row
	Empty string // what is said where there is no row
}

type row struct {
	Subject value
	Cells   []cell
}

// value is what is shown, and what a program reads.
type value struct{ Text, Raw string }

// cell is a value, the whole that it is a part of, and both of the week before. An empty text is absent.
type cell struct{ Now, Of, Last, LastOf value }

// Said is the cell beside its label: "3 of 120 (last week 2 of 118)".
func (c cell) Said() string { return c.with("last week ") }

// String is the cell within a table: "3 of 120 (2 of 118)".
func (c cell) String() string { return c.with("") }

func (c cell) with(words string) string {
	s := part(c.Now, c.Of)
	if last := part(c.Last, c.LastOf); last != "" {
		s += " (" + words + last + ")"
	}
	return s
}

func part(v, of value) string {
	if of.Text == "" {
		return v.Text
	}
	return v.Text + " of " + of.Text
}

func count(n int) value { return value{rules.Thousands(n), strconv.Itoa(n)} }

func real(v float64, decimals int) value {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return value{"-", ""}
	}
	return value{strconv.FormatFloat(v, 'f', decimals, 64), strconv.FormatFloat(v, 'g', -1, 64)}
}

// optional is a figure that may be absent.
func optional(n rules.Num, show func(float64) value) value {
	if !n.OK {
		return value{"-", ""}
	}
	return show(n.V)
}

// chance is a probability.
func chance(p float64) value {
	raw := strconv.FormatFloat(p, 'g', -1, 64)
	switch {
	case p < 0.001:
		return value{"under 0.001", raw}
	default:
		return value{strconv.FormatFloat(p, 'f', 3, 64), raw}
	}
}

// fraction is a return, shown in per cent.
func fraction(v float64) value {
	return value{rules.InPercent(v), strconv.FormatFloat(v, 'g', -1, 64)}
}

func units(u rules.Units) value {
	if u == rules.Missing {
		return value{"-", ""}
	}
	return value{rules.InPercent(u.Float()), u.String()}
}

// text is a word of ours.
func text(s string) value { return value{s, s} }

// foreign is a name or a note out of other people's files.
func foreign(s string) value {
	if s == "" {
		return value{"-", ""}
	}
	return value{notify.Name(s), s}
}

func note(s string) value {
	if s == "" {
		return value{"-", ""}
	}
	return value{notify.Safe(s, 160), s}
}

func date(d rules.Date) value {
	if d == rules.NoDate {
		return value{"-", ""}
	}
	return value{d.Day(), d.String()}
}

func moment(t time.Time, zone *time.Location) value {
	return value{t.In(zone).Format("Mon 2006-01-02 15:04"), t.UTC().Format(time.RFC3339)}
}

// only is a cell that has no week before.
func only(v value) cell { return cell{Now: v} }

// both is a value beside that of the week before.
func both(now, last value) cell { return cell{Now: now, Last: last} }

// parts is a part of a whole beside the same of the week before.
func parts(now, of, last, lastOf value) cell { return cell{now, of, last, lastOf} }

// counts is a count of a whole beside the same of the week before.
func counts(now, of, last, lastOf int) cell {
	return parts(count(now), count(of), count(last), count(lastOf))
}

func portions(now, last rules.Portion) cell {
	return counts(now.Part, now.Whole, last.Part, last.Whole)
}

func (s *section) say(label string, c cell)   { s.Figures = append(s.Figures, figure{label, c, false}) }
func (s *section) first(label string, c cell) { s.Figures = append(s.Figures, figure{label, c, true}) }
