package rules

import (
	"testing"
	"time"

	"pgregory.net/rapid"
)

// slowBusiness says by definition whether a day is a business day: it looks through the lists.
func slowBusiness(c *Calendar, d Date) bool {
	for _, open := range c.Open {
		if open == d {
			return true
		}
	}
	for _, closed := range c.Holidays {
		if closed == d {
			return false
		}
	}
	week := c.Week
	if week == 0 {
		return d.Weekday() != time.Saturday && d.Weekday() != time.Sunday
	}
	return week>>d.Weekday()&1 == 1
}

func drawCalendar(t *rapid.T) *Calendar {
	day := rapid.Custom(func(t *rapid.T) Date { return Date(rapid.IntRange(-400, 400).Draw(t, "day")) })
	return NewCalendar(Week(rapid.IntRange(0, 127).Draw(t, "week")), rapid.SliceOfN(day, 0, 20).Draw(t, "closed"), rapid.SliceOfN(day, 0, 20).Draw(t, "open"))
}

// Counting and adding business days equal a walk day by day.
func TestCalendarEqualsAWalk(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := drawCalendar(t)
		from := Date(rapid.IntRange(-500, 500).Draw(t, "from"))
		to := from + Date(rapid.IntRange(-3, 300).Draw(t, "span"))
		count := 0
		for d := from + 1; d <= to; d++ {
			if c.Business(d) != slowBusiness(c, d) {
				t.Fatalf("%s: Business is %v", d, c.Business(d))
			}
			if slowBusiness(c, d) {
				count++
			}
		}
		if got := c.Between(from, to); got != count {
			t.Fatalf("Between(%s, %s) = %d, want %d", from, to, got, count)
		}
		n := rapid.IntRange(-30, 30).Draw(t, "n")
		if got, want := c.Add(from, n), slowAdd(c, from, n); got != want {
			t.Fatalf("Add(%s, %d) = %s, want %s", from, n, got, want)
		}
	})
}

// slowAdd walks: a day that is none counts as the business day before it.
func slowAdd(c *Calendar, d Date, n int) Date {
	step := Date(1)
	if n < 0 || n > 0 {
		for !slowBusiness(c, d) {
			d--
		}
	}
	if n < 0 {
		step, n = -1, -n
	}
	if n == 0 {
		for !slowBusiness(c, d) {
			d++
		}
	}
	for n > 0 {
		d += step
		if slowBusiness(c, d) {
			n--
		}
	}
	return d
}

// By hand, in a week with a holiday: Friday 2026-04-03 and Monday 2026-04-06 are closed.
func TestCalendarByHand(t *testing.T) {
	good, easter := date(t, "2026-04-03"), date(t, "2026-04-06")
	c := NewCalendar(0, []Date{easter, good, easter, date(t, "2026-04-05")}, nil)
	if len(c.Holidays) != 2 || c.Holidays[0] != good {
		t.Errorf("holidays %v: a Sunday is none, and a day given twice is one", c.Holidays)
	}
	check := func(what string, got, want any) {
		t.Helper()
		if got != want {
			t.Errorf("%s is %v, want %v", what, got, want)
		}
	}
	thursday, tuesday := date(t, "2026-04-02"), date(t, "2026-04-07")
	check("between", c.Between(thursday, tuesday), 1)
	check("add", c.Add(thursday, 1), tuesday)
	check("back", c.Add(tuesday, -1), thursday)
	check("none of a holiday", c.Add(good, 0), tuesday)
	check("near", c.Near(tuesday, thursday), true)
	check("not near", c.Near(thursday, tuesday+1), false)
	check("nil", (*Calendar)(nil).Between(thursday, tuesday), 3)
	sunday := NewCalendar(0b0011111, nil, []Date{date(t, "2026-04-03")}) // Sunday to Thursday, and one Friday
	check("Sunday", sunday.Business(date(t, "2026-04-05")), true)
	check("Saturday", sunday.Business(date(t, "2026-04-04")), false)
	check("the open Friday", sunday.Business(good), true)
}

// A deadline a business day after falls after the holidays. Checked by hand.
func TestDueAfterHolidays(t *testing.T) {
	c := NewCalendar(0, []Date{date(t, "2026-04-03"), date(t, "2026-04-06")}, nil)
	d := Due{Minutes: 11 * 60, Days: 1, Calendar: c}
	if got := DueAt(d, date(t, "2026-04-02"), time.UTC).Format(time.RFC3339); got != "2026-04-07T11:00:00Z" {
		t.Errorf("due at %s", got)
	}
	from, upto := date(t, "2026-04-02").Time(), date(t, "2026-04-09").Time()
	dates := DueBetween(d, from, upto, time.UTC)
	want := []string{"2026-04-01", "2026-04-02", "2026-04-07"} // due on the 2nd, the 7th and the 8th
	if len(dates) != len(want) {
		t.Fatalf("due %v, want %v", dates, want)
	}
	for i, d := range dates {
		if d.String() != want[i] {
			t.Errorf("due %v, want %v", dates, want)
		}
	}
}

// The calendar of a series is its own, else that of all; a life that has ended expects nothing.
func TestSettingsExpect(t *testing.T) {
	friday := date(t, "2026-04-03")
	s := Settings{Calendar: "holidays", Calendars: map[string]*Calendar{"holidays": NewCalendar(0, []Date{friday}, nil)},
		CalendarOf: map[string]string{"alder": "weekdays"}, Lives: map[string]Life{"birch": {NoDate, friday}, "cedar": {friday + 4, NoDate}}}
	for _, tt := range []struct {
		series string
		day    Date
		want   bool
	}{{"alder", friday, true}, {"dale", friday, false}, {"dale", friday - 1, true}, {"birch", friday - 1, true}, {"birch", friday + 4, false},
		{"cedar", friday - 1, false}, {"cedar", friday + 4, true}} {
		if got := s.Expects(tt.series, tt.day); got != tt.want {
			t.Errorf("%s on %s: %v", tt.series, tt.day, got)
		}
	}
}
