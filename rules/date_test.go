package rules_test

import (
	"testing"
	"time"

	"strayd/rules"
)

// Four centuries hold every pattern of leap years: each day against the standard library's calendar.
func TestDatesAgainstTime(t *testing.T) {
	at := time.Date(1800, 1, 1, 0, 0, 0, 0, time.UTC)
	for d := rules.DateFrom(at); at.Year() < 2202; d, at = d+1, at.AddDate(0, 0, 1) {
		got, ok := rules.DateOf(at.Year(), int(at.Month()), at.Day())
		if got != d || !ok {
			t.Fatalf("DateOf(%s) is %d, %v, want %d", at.Format(time.DateOnly), got, ok, d)
		}
		if d.String() != at.Format(time.DateOnly) || d.Weekday() != at.Weekday() || !d.Time().Equal(at) {
			t.Fatalf("%s is %s, a %s, %s", at.Format(time.DateOnly), d, d.Weekday(), d.Time())
		}
		if parsed, err := rules.ParseDate(d.String()); parsed != d || err != nil {
			t.Fatalf("ParseDate(%s) is %d, %v", d, parsed, err)
		}
	}
}

func TestDatesThatAreNone(t *testing.T) {
	for _, c := range [][3]int{{2026, 2, 29}, {1900, 2, 29}, {2100, 2, 29}, {2026, 4, 31}, {2026, 0, 1}, {2026, 13, 1}, {2026, 1, 0}, {2026, 1, 32},
		{2026, -1, 1}, {2026, 1, -1}} {
		if d, ok := rules.DateOf(c[0], c[1], c[2]); ok || d != rules.NoDate {
			t.Errorf("DateOf(%v) is %s, %v", c, d, ok)
		}
	}
	for _, s := range []string{"", "2026-2-28", "2026-02-29", "26-02-28", "2026-02-28T00:00:00Z", " 2026-02-28", "2026/02/28", "２０２６-02-28", "-026-02-28"} {
		if d, err := rules.ParseDate(s); err == nil || d != rules.NoDate {
			t.Errorf("ParseDate(%q) is %s, %v", s, d, err)
		}
	}
	for _, y := range []int{2000, 2024, 1600} {
		if _, ok := rules.DateOf(y, 2, 29); !ok {
			t.Errorf("%d is a leap year", y)
		}
	}
	if rules.NoDate.String() != "" {
		t.Errorf("NoDate is written %q", rules.NoDate)
	}
	if d, _ := rules.DateOf(-4000, 1, 1); d <= rules.NoDate {
		t.Error("NoDate is not before every other date")
	}
}

// The day of a moment is that of its own location.
func TestDateOfAMoment(t *testing.T) {
	east, west := time.FixedZone("east", 14*3600), time.FixedZone("west", -12*3600)
	moment := time.Date(2026, 3, 13, 11, 0, 0, 0, time.UTC)
	for zone, want := range map[*time.Location]string{time.UTC: "2026-03-13", east: "2026-03-14", west: "2026-03-12"} {
		if got := rules.DateFrom(moment.In(zone)).String(); got != want {
			t.Errorf("in %s it is %s, want %s", zone, got, want)
		}
	}
}

// Weekdays against counting them one by one, around the epoch and before it.
func TestWeekdays(t *testing.T) {
	first, _ := rules.DateOf(1969, 12, 1)
	for from := first; from < first+60; from++ {
		n := 0
		for to := from - 3; to < from+60; to++ {
			if to > from && to.Time().Weekday() != time.Saturday && to.Time().Weekday() != time.Sunday {
				n++
			}
			if got := rules.Weekdays(from, to); got != n {
				t.Fatalf("Weekdays(%s, %s) is %d, want %d", from, to, got, n)
			}
		}
	}
	// a leap cycle of 400 years has 20,871 weeks
	if a, _ := rules.DateOf(1800, 1, 1); rules.Weekdays(a, a+146097) != 20871*5 {
		t.Errorf("400 years have %d weekdays, want %d", rules.Weekdays(a, a+146097), 20871*5)
	}
}
