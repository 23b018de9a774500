package schedule

import (
	"testing"
	"time"
	_ "time/tzdata" // so that the test needs no zone files on the machine
)

// The nine zones of the golden tests: two ordinary changes, midnight gaps, a half-hour change, a change for one month, none.
var zones = []string{"America/New_York", "Europe/London", "America/Santiago", "America/Sao_Paulo", "Asia/Tehran",
	"Australia/Lord_Howe", "Africa/Casablanca", "Asia/Kolkata", "UTC"}

// Daily jobs on and around every time at which one of the zones changes its clocks.
var daily = []string{"@daily", "0 0 * * *", "30 0 * * *", "30 1 * * *", "0 2 * * *", "15 2 * * *", "30 2 * * *", "0 3 * * *",
	"30 23 * * *", "0 18 * * *"}

func zone(t testing.TB, name string) *time.Location {
	t.Helper()
	z, err := time.LoadLocation(name)
	if err != nil {
		t.Fatal(err)
	}
	return z
}

func parse(t testing.TB, spec string, z *time.Location) Schedule {
	t.Helper()
	s, err := Parse(spec, z)
	if err != nil {
		t.Fatalf("Parse(%q): %v", spec, err)
	}
	return s
}

// The outside expectation is the calendar itself: 2015 to 2026 have 4,383 days, and each must see one run.
func TestEachDailyJobRunsOnceACivilDay(t *testing.T) {
	const days = 9*365 + 3*366
	for _, name := range zones {
		z := zone(t, name)
		for _, spec := range daily {
			checkDaily(t, parse(t, spec, z), name, days)
		}
	}
}

func checkDaily(t *testing.T, s Schedule, name string, days int) {
	t.Helper()
	at := time.Date(2014, 12, 31, 23, 59, 59, 0, s.zone)
	for day := range days {
		at = s.Next(at)
		want := time.Date(2015, 1, 1+day, 12, 0, 0, 0, time.UTC).Format(time.DateOnly)
		if got := at.Format(time.DateOnly); got != want {
			t.Errorf("%s %s: run %d falls on %s, want %s", name, s, day, got, want)
			return
		}
	}
}

// Every run is also held against a search of another kind: the first whole minute of the day at which the wall clock shows the
// time of the job or a later one.
func TestDailyRunIsFirstMinuteAtOrAfterItsTime(t *testing.T) {
	for _, name := range zones {
		z := zone(t, name)
		for _, spec := range []string{"30 0 * * *", "30 1 * * *", "15 2 * * *", "0 3 * * *"} {
			s := parse(t, spec, z)
			for _, change := range changes(z) {
				checkDay(t, s, change)
			}
		}
	}
}

// changes are the instants from 2015 to 2026 at which the zone's offset changes.
func changes(z *time.Location) (at []time.Time) {
	last := time.Date(2027, 1, 1, 0, 0, 0, 0, time.UTC)
	for t := time.Date(2015, 1, 1, 0, 0, 0, 0, z); ; {
		_, t = t.ZoneBounds()
		if t.IsZero() || t.After(last) {
			return at
		}
		at = append(at, t)
	}
}

func checkDay(t *testing.T, s Schedule, change time.Time) {
	t.Helper()
	minute, hour := s.clockFields()
	target := pad(hour) + ":" + pad(minute)
	at := change.Add(-12 * time.Hour).Truncate(time.Minute).In(s.zone)
	run := s.Next(at)
	day := run.Format(time.DateOnly)
	for at.Format(time.DateOnly) != day || at.Format("15:04") < target {
		at = at.Add(time.Minute)
	}
	if !run.Equal(at) {
		t.Errorf("%s %s: runs at %s, want %s", s.zone, s, run, at)
	}
}

func pad(s string) string {
	if len(s) == 1 {
		return "0" + s
	}
	return s
}

// Instants worked out by hand from the changes that zdump(8) lists for each zone.
func TestRunsAroundClockChanges(t *testing.T) {
	tests := []struct{ zone, spec, from, want string }{
		// gaps: the first instant after
		{"America/New_York", "30 2 * * *", "2026-03-08T00:00:00-05:00", "2026-03-08T03:00:00-04:00"},
		{"Europe/London", "30 1 * * *", "2026-03-29T00:00:00Z", "2026-03-29T02:00:00+01:00"},
		{"America/Santiago", "0 0 * * *", "2026-09-05T12:00:00-04:00", "2026-09-06T01:00:00-03:00"},
		{"America/Sao_Paulo", "@daily", "2018-11-03T12:00:00-03:00", "2018-11-04T01:00:00-02:00"},
		{"Asia/Tehran", "30 0 * * *", "2022-03-21T12:00:00+03:30", "2022-03-22T01:00:00+04:30"},
		{"Australia/Lord_Howe", "15 2 * * *", "2026-10-03T12:00:00+10:30", "2026-10-04T02:30:00+11:00"},
		{"Africa/Casablanca", "30 2 * * *", "2026-03-21T12:00:00Z", "2026-03-22T03:00:00+01:00"},
		// after the gap the next run is the next day's
		{"America/New_York", "30 2 * * *", "2026-03-08T03:00:00-04:00", "2026-03-09T02:30:00-04:00"},
		// folds: the first showing, and not the second
		{"America/New_York", "30 1 * * *", "2026-11-01T00:00:00-04:00", "2026-11-01T01:30:00-04:00"},
		{"America/New_York", "30 1 * * *", "2026-11-01T01:30:00-04:00", "2026-11-02T01:30:00-05:00"},
		{"America/New_York", "45 1 * * *", "2026-11-01T01:30:00-05:00", "2026-11-02T01:45:00-05:00"},
		{"Australia/Lord_Howe", "45 1 * * *", "2026-04-05T00:00:00+11:00", "2026-04-05T01:45:00+11:00"},
		// a civil day that a zone left out altogether: its run comes with the next instant there is
		{"Pacific/Apia", "0 18 * * *", "2011-12-29T18:00:00-10:00", "2011-12-31T00:00:00+14:00"},
		// every hour: real time on both sides
		{"America/New_York", "*/15 * * * *", "2026-03-08T01:45:00-05:00", "2026-03-08T03:00:00-04:00"},
		{"America/New_York", "*/15 * * * *", "2026-11-01T01:45:00-04:00", "2026-11-01T01:00:00-05:00"},
		{"America/New_York", "@hourly", "2026-11-01T01:00:00-04:00", "2026-11-01T01:00:00-05:00"},
		{"Asia/Kolkata", "0 * * * *", "2026-06-01T10:00:00+05:30", "2026-06-01T11:00:00+05:30"},
		{"Australia/Lord_Howe", "0 * * * *", "2026-10-04T01:00:00+10:30", "2026-10-04T03:00:00+11:00"},
		{"UTC", "@every 90m", "2026-06-01T00:10:00Z", "2026-06-01T01:30:00Z"},
		// minutes of given hours: at least once after a gap, at both showings in a fold
		{"Europe/London", "*/20 1 * * *", "2026-03-29T00:00:00Z", "2026-03-29T02:00:00+01:00"},
		{"Europe/London", "*/20 1 * * *", "2026-03-29T02:00:00+01:00", "2026-03-30T01:00:00+01:00"},
		{"Europe/London", "*/20 1 * * *", "2026-10-25T01:40:00+01:00", "2026-10-25T01:00:00Z"},
		// 2100 is no leap year, so eight years pass between two leap days
		{"UTC", "0 9 29 2 *", "2096-03-01T00:00:00Z", "2104-02-29T09:00:00Z"},
	}
	for _, tt := range tests {
		from, _ := time.Parse(time.RFC3339, tt.from)
		got := parse(t, tt.spec, zone(t, tt.zone)).Next(from).Format(time.RFC3339)
		if got != tt.want {
			t.Errorf("%s %q after %s: %s, want %s", tt.zone, tt.spec, tt.from, got, tt.want)
		}
	}
}

// An hourly job in real time runs once each hour whatever the zone does, where the zone's changes are whole hours.
func TestHourlyRunsEachRealHour(t *testing.T) {
	for _, name := range []string{"America/New_York", "America/Santiago", "Asia/Kolkata", "Africa/Casablanca"} {
		s := parse(t, "@hourly", zone(t, name))
		at := s.Next(time.Date(2026, 1, 1, 0, 0, 0, 0, s.zone))
		for range 24 * 365 {
			next := s.Next(at)
			if next.Sub(at) != time.Hour {
				t.Fatalf("%s: %s comes %s after %s", name, next, next.Sub(at), at)
			}
			at = next
		}
	}
}
