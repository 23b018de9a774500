package watcher

import (
	"fmt"
	"slices"

	"strayd/rules"
)

// oddDays is how many of the last TypicalDates dates held must be no business days for the calendar to be the one that is wrong.
const oddDays = 5

// dates refuses a file with dates that cannot be meant, and one with values on days that are no business days of their series. A first
// load is only told of them.
func (g *fileGate) dates() (*rules.Refusal, error) {
	changed := changedDates(g.blocks)
	calendar := g.p.Settings.CalendarFor("")
	f := rules.FileDates{Dates: changed, Last: g.p.lastTaken(g.feed.Name), Today: rules.DateFrom(g.j.now), Style: g.feed.DateStyle, Calendar: calendar}
	for _, d := range changed {
		if !g.heldOn(d) {
			f.New = append(f.New, d)
		}
	}
	if taken := g.p.taken[g.feed.Name]; len(taken) > 0 && len(changed) > 0 {
		f.Whole = 2*g.sheet.Rows >= taken[len(taken)-1].Counts.Rows
	}
	if r := rules.RefuseDates(f); r != nil {
		return r, nil
	}
	for _, d := range changed {
		if closed := g.closed(d); closed != nil && !g.oddBefore(d) {
			return rules.RefuseClosed(closed), nil
		}
	}
	return nil, nil
}

// heldOn says whether anything was held on a date of the series that the file changes there.
func (g *fileGate) heldOn(date rules.Date) bool {
	for _, b := range g.blocks {
		if d := dayOf(g.blocks, b.number, date); d != nil && d.old != nil {
			return true
		}
	}
	return false
}

// closed finds the held series that have a value on a date that is none of their business days; nil when there is none. New series are
// in their first load: they are noted.
func (g *fileGate) closed(date rules.Date) *rules.ClosedDay {
	s := &g.p.Settings
	all := s.Calendars[s.Calendar]
	if len(s.CalendarOf) == 0 && all.Business(date) {
		return nil
	}
	c := &rules.ClosedDay{Date: date, Calendar: s.Calendar}
	fresh := 0
	for _, b := range g.blocks {
		d := dayOf(g.blocks, b.number, date)
		if d == nil {
			continue
		}
		for i := range d.col.Len() {
			id := b.number*BlockSize + uint32(i)
			if !d.col.has(i) || s.CalendarFor(g.name(id)).Business(date) {
				continue
			}
			if int(id) >= g.j.firstNames {
				fresh++
				continue
			}
			c.Series.Add(g.name(id))
			if own := s.CalendarOf[g.name(id)]; own != "" {
				c.Calendar = own
			}
		}
	}
	if fresh > 0 {
		g.sheet.Notes = append(g.sheet.Notes, fmt.Sprintf("%s of %s, which is no business day under the calendar", rules.Counted(fresh,
			"value"), date.Day()))
	}
	if c.Series.Count == 0 {
		return nil
	}
	return c
}

func (g *fileGate) name(id uint32) string { return string(g.j.names.Name(id)) }

// oddBefore says that the dates held before are so often no business days that the calendar cannot be that of these series.
func (g *fileGate) oddBefore(date rules.Date) bool {
	n, _ := slices.BinarySearch(g.j.held, date)
	odd := 0
	calendar := g.p.Settings.CalendarFor("")
	for _, d := range g.j.held[max(0, n-rules.TypicalDates):n] {
		if !calendar.Business(d) {
			odd++
		}
	}
	return odd >= oddDays
}
