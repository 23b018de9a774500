package rules

import (
	"slices"
	"testing"
	"time"
	_ "time/tzdata" // so that the test needs no zone files on the machine

	"pgregory.net/rapid"
)

func date(t testing.TB, s string) Date {
	t.Helper()
	d, err := ParseDate(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func place(t testing.TB, name string) *time.Location {
	t.Helper()
	z, err := time.LoadLocation(name)
	if err != nil {
		t.Fatal(err)
	}
	return z
}

// Days read off a printed calendar: 5 June 2026 is a Friday.
func TestAddWeekdays(t *testing.T) {
	tests := []struct {
		from string
		n    int
		want string
	}{
		{"2026-06-05", 0, "2026-06-05"}, {"2026-06-05", 1, "2026-06-08"}, {"2026-06-05", 5, "2026-06-12"}, {"2026-06-05", 6, "2026-06-15"},
		{"2026-06-06", 0, "2026-06-08"}, {"2026-06-06", 1, "2026-06-08"}, {"2026-06-07", 0, "2026-06-08"}, {"2026-06-07", 2, "2026-06-09"},
		{"2026-06-08", -1, "2026-06-05"}, {"2026-06-08", -6, "2026-05-29"}, {"1969-12-31", 2, "1970-01-02"}, {"1969-12-26", 1, "1969-12-29"},
	}
	for _, tt := range tests {
		if got := AddWeekdays(date(t, tt.from), tt.n).String(); got != tt.want {
			t.Errorf("AddWeekdays(%s, %d) = %s, want %s", tt.from, tt.n, got, tt.want)
		}
	}
}

// Instants worked out by hand from the changes that zdump(8) lists for each zone.
func TestDueAt(t *testing.T) {
	tests := []struct {
		zone    string
		minutes int
		days    int
		date    string
		want    string
	}{
		{"UTC", 19*60 + 30, 0, "2026-06-05", "2026-06-05T19:30:00Z"},
		{"America/New_York", 11 * 60, 1, "2026-03-06", "2026-03-09T11:00:00-04:00"}, // over the weekend of the change
		{"America/New_York", 11 * 60, 1, "2026-03-05", "2026-03-06T11:00:00-05:00"},
		// weekdays that begin with a gap, or lack a stretch: the first instant after
		{"Asia/Tehran", 30, 0, "2022-03-22", "2022-03-22T01:00:00+04:30"},
		{"Africa/Cairo", 15, 1, "2023-04-27", "2023-04-28T01:00:00+03:00"},
		{"Pacific/Apia", 18 * 60, 0, "2011-12-30", "2011-12-31T00:00:00+14:00"}, // a Friday that the zone left out
		// a weekday that shows an hour twice: the first showing
		{"Africa/Cairo", 23*60 + 30, 0, "2023-10-26", "2023-10-26T23:30:00+03:00"},
		{"Asia/Tehran", 23*60 + 30, 0, "2021-09-21", "2021-09-21T23:30:00+04:30"},
	}
	for _, tt := range tests {
		d := Due{Minutes: tt.minutes, Days: tt.days, Timezone: tt.zone}
		if got := DueAt(d, date(t, tt.date), place(t, tt.zone)).Format(time.RFC3339); got != tt.want {
			t.Errorf("%s of %s, %d days on, minute %d: %s, want %s", tt.zone, tt.date, tt.days, tt.minutes, got, tt.want)
		}
	}
}

var places = []string{"America/New_York", "Europe/London", "America/Santiago", "America/Sao_Paulo", "Asia/Tehran", "Australia/Lord_Howe",
	"Africa/Casablanca", "Asia/Kolkata", "Africa/Cairo", "Pacific/Apia", "UTC"}

// slowDue walks the days one by one to the business day, then from a day before it minute by minute until the wall shows the time
// of day or a later one.
func slowDue(d Due, date Date, zone *time.Location) time.Time {
	day := date
	for left := d.Days; left > 0; {
		if day++; day.Weekday() != time.Saturday && day.Weekday() != time.Sunday {
			left--
		}
	}
	civil := day.Time().Add(time.Duration(d.Minutes) * time.Minute)
	target, at := civil.Format("2006-01-02 15:04"), civil.Add(-15*time.Hour) // no zone is further ahead
	for at.In(zone).Format("2006-01-02 15:04") < target {
		at = at.Add(time.Minute)
	}
	return at
}

func drawDue(t *rapid.T) (Due, *time.Location) {
	name := rapid.SampledFrom(places).Draw(t, "zone")
	zone, err := time.LoadLocation(name)
	if err != nil {
		t.Fatal(err)
	}
	return Due{rapid.IntRange(0, 24*60-1).Draw(t, "minutes"), rapid.IntRange(0, 30).Draw(t, "days"), name, nil}, zone
}

// drawDay is a Monday to Friday from 2011 to 2026.
func drawDay(t *rapid.T) Date {
	d := Date(rapid.IntRange(14975, 20818).Draw(t, "day"))
	return d - Date(max(0, int(d.Weekday()+6)%7-4))
}

func TestDueAtEqualsASlowWalk(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, zone := drawDue(t)
		day := drawDay(t)
		if got, want := DueAt(d, day, zone), slowDue(d, day, zone); !got.Equal(want) {
			t.Fatalf("%+v of %s: %s, want %s", d, day, got, want)
		}
	})
}

// The same over every change of every zone's clocks, at each half hour of the days around it.
func TestDueAtAroundClockChanges(t *testing.T) {
	for _, name := range places {
		zone := place(t, name)
		last := time.Date(2027, 1, 1, 0, 0, 0, 0, time.UTC)
		for _, at := time.Date(2011, 1, 1, 0, 0, 0, 0, zone).ZoneBounds(); !at.IsZero() && at.Before(last); _, at = at.ZoneBounds() {
			for day := DateFrom(at) - 1; day <= DateFrom(at)+1; day++ {
				for minutes := 0; minutes < 24*60 && day == AddWeekdays(day, 0); minutes += 30 {
					d := Due{Minutes: minutes, Timezone: name}
					if got, want := DueAt(d, day, zone), slowDue(d, day, zone); !got.Equal(want) {
						t.Fatalf("%s, minute %d of %s: %s, want %s", name, minutes, day, got, want)
					}
				}
			}
		}
	}
}

// Looking from time to time lists what looking at every date would: each once, in order, as soon as it is due.
func TestDueBetweenListsEachDateOnce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, zone := drawDue(t)
		day := drawDay(t)
		begin := day.Time().Add(time.Duration(rapid.IntRange(-48, 48).Draw(t, "hours")) * time.Hour)
		at := begin
		var got []Date
		for range rapid.IntRange(1, 20).Draw(t, "looks") {
			next := at.Add(time.Duration(rapid.IntRange(0, 4*24*60).Draw(t, "wait")) * time.Minute)
			got = append(got, DueBetween(d, at, next, zone)...)
			at = next
		}
		var want []Date
		for n := day - 50; n < day+90; n++ {
			if wd := n.Weekday(); wd == time.Saturday || wd == time.Sunday {
				continue
			}
			if due := slowDue(d, n, zone); due.After(begin) && !due.After(at) {
				want = append(want, n)
			}
		}
		if !slices.Equal(got, want) {
			t.Fatalf("%+v from %s to %s: %v, want %v", d, begin, at, got, want)
		}
	})
}

func TestNextDueIsTheFirstThatDueBetweenWillList(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d, zone := drawDue(t)
		after := drawDay(t).Time().Add(time.Duration(rapid.IntRange(0, 24*60).Draw(t, "minute")) * time.Minute)
		next, at := NextDue(d, after, zone)
		if !at.Equal(DueAt(d, next, zone)) || !at.After(after) {
			t.Fatalf("%s at %s after %s", next, at, after)
		}
		if early := DueBetween(d, after, at.Add(-time.Nanosecond), zone); len(early) > 0 {
			t.Fatalf("%v are due before %s", early, at)
		}
		if due := DueBetween(d, after, at, zone); len(due) == 0 || due[0] != next {
			t.Fatalf("%v are due by %s, want %s first", due, at, next)
		}
	})
}

func TestDueBetweenOfNothing(t *testing.T) {
	at := time.Date(2026, 6, 5, 19, 30, 0, 0, time.UTC)
	d := Due{Minutes: 19*60 + 30}
	for _, after := range []time.Time{at, at.Add(time.Hour)} {
		if got := DueBetween(d, after, at, time.UTC); got != nil {
			t.Errorf("from %s to %s: %v", after, at, got)
		}
	}
	if got := DueBetween(d, at.Add(-time.Second), at, time.UTC); !slices.Equal(got, []Date{date(t, "2026-06-05")}) {
		t.Errorf("up to the due time itself: %v", got)
	}
}
