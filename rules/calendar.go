package rules

import (
	"math/bits"
	"slices"
	"time"
)

// Week is a set of weekdays: bit n stands for time.Weekday n, Sunday for 0. The empty set stands for Monday to Friday.
type Week uint8

// MondayToFriday is what the empty Week stands for.
const MondayToFriday Week = 0b0111110

// Calendar says which days are business days. The zero value, and nil, are all days from Monday to Friday.
type Calendar struct {
	Week     Week   `json:",omitempty"`
	Holidays []Date `json:",omitempty"` // no business days though their weekday is one; ascending
	Open     []Date `json:",omitempty"` // business days though their weekday is none; ascending
}

// NewCalendar makes a calendar from days in any order. A day that is closed and open is open; one that the week decides already is
// left out.
func NewCalendar(week Week, closed, open []Date) *Calendar {
	c := &Calendar{Week: week}
	if week == MondayToFriday {
		c.Week = 0
	}
	for _, d := range ascending(open) {
		if !c.in(d) {
			c.Open = append(c.Open, d)
		}
	}
	for _, d := range ascending(closed) {
		if c.in(d) && !slices.Contains(open, d) {
			c.Holidays = append(c.Holidays, d)
		}
	}
	return c
}

func ascending(days []Date) []Date {
	days = slices.Clone(days)
	slices.Sort(days)
	return slices.Compact(days)
}

// Same says that two calendars have the same business days.
func (c *Calendar) Same(o *Calendar) bool {
	return c == o || c.Weekdays() == o.Weekdays() && slices.Equal(c.plain().Holidays, o.plain().Holidays) && slices.Equal(c.plain().Open, o.plain().Open)
}

// plain is the calendar of nil.
func (c *Calendar) plain() *Calendar {
	if c == nil {
		return &Calendar{}
	}
	return c
}

// Weekdays is the set of weekdays, never empty.
func (c *Calendar) Weekdays() Week {
	if c == nil || c.Week == 0 {
		return MondayToFriday
	}
	return c.Week
}

// Has says whether a weekday is in the set.
func (w Week) Has(d time.Weekday) bool { return w>>d&1 == 1 }

func (c *Calendar) in(d Date) bool { return c.Weekdays().Has(d.Weekday()) }

// Business says whether a date is a business day.
func (c *Calendar) Business(d Date) bool {
	c = c.plain()
	if c.in(d) {
		return !found(c.Holidays, d)
	}
	return found(c.Open, d)
}

func found(days []Date, d Date) bool {
	_, ok := slices.BinarySearch(days, d)
	return ok
}

// Between counts the business days after from, up to and including to; 0 when to is not after from.
func (c *Calendar) Between(from, to Date) int {
	if to <= from {
		return 0
	}
	c = c.plain()
	return c.upTo(to) - c.upTo(from)
}

// upTo counts the business days from Sunday 1970-01-04 (day 3) up to and including d, but for a constant; negative before it.
func (c *Calendar) upTo(d Date) int {
	mask := c.Weekdays()
	n := int(d) - 3
	week := floorDiv(n, 7)
	begun := mask & (1<<(n-7*week+1) - 1)
	return week*bits.OnesCount8(uint8(mask)) + bits.OnesCount8(uint8(begun)) - countUpTo(c.Holidays, d) + countUpTo(c.Open, d)
}

func countUpTo(days []Date, d Date) int {
	n, _ := slices.BinarySearch(days, d+1)
	return n
}

// Add is the n-th business day after d, or before it for a negative n; for n = 0 it is d, or the business day after it when d is
// none. A day that is none counts as the business day before it.
func (c *Calendar) Add(d Date, n int) Date {
	c = c.plain()
	want := c.upTo(d) + n
	if n == 0 && !c.Business(d) {
		want++
	}
	for short := want - c.upTo(d); short > 0; short = want - c.upTo(d) {
		d += Date(short) // the count grows by at most one a day: the last step ends on a business day
	}
	for over := c.upTo(d-1) - want; over >= 0; over = c.upTo(d-1) - want {
		d -= Date(over + 1)
	}
	return d
}

// Near says whether two dates are the same or neighbouring business days: how an event is matched to a value when one of the two is a
// business day off.
func (c *Calendar) Near(a, b Date) bool {
	a, b = min(a, b), max(a, b)
	return a == b || c.Between(a, b) <= 1
}

// CalendarFor is the calendar of a series: that which the register names, else the one of all; nil for Monday to Friday.
func (s *Settings) CalendarFor(series string) *Calendar {
	name := s.CalendarOf[series]
	if name == "" {
		name = s.Calendar
	}
	return s.Calendars[name]
}
