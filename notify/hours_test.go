package notify

import (
	"testing"
	"time"
)

// Clock changes as the zones' own rules have them: New York 2026-03-08 02:00 to 03:00 and 2026-11-01 02:00 to 01:00 (Energy Policy
// Act of 2005); Lord Howe 2026-10-04 02:00 to 02:30, half an hour; Santiago 2026-09-06 00:00 to 01:00.
func TestOpening(t *testing.T) {
	check := func(zone string, from, to int, at, want string) {
		t.Helper()
		z, err := time.LoadLocation(zone)
		if err != nil {
			t.Fatal(err)
		}
		when, err := time.Parse(time.RFC3339, at)
		if err != nil {
			t.Fatal(err)
		}
		if got := (Hours{from, to, z}).Opening(when).In(z).Format(time.RFC3339); got != want {
			t.Errorf("%s %d-%d at %s: got %s, want %s", zone, from, to, at, got, want)
		}
	}
	const h = 60
	// within, before, after; the end is no longer part of it
	check("UTC", 7*h, 19*h, "2026-03-13T12:00:30Z", "2026-03-13T12:00:30Z")
	check("UTC", 7*h, 19*h, "2026-03-13T06:59:59Z", "2026-03-13T07:00:00Z")
	check("UTC", 7*h, 19*h, "2026-03-13T19:00:00Z", "2026-03-14T07:00:00Z")
	check("UTC", 7*h, 19*h, "2026-03-13T07:00:00Z", "2026-03-13T07:00:00Z")
	// over midnight, up to midnight, always
	check("UTC", 22*h, 6*h, "2026-03-13T23:30:00Z", "2026-03-13T23:30:00Z")
	check("UTC", 22*h, 6*h, "2026-03-13T05:59:00Z", "2026-03-13T05:59:00Z")
	check("UTC", 22*h, 6*h, "2026-03-13T06:00:00Z", "2026-03-13T22:00:00Z")
	check("UTC", 22*h, 24*h, "2026-03-13T23:59:59Z", "2026-03-13T23:59:59Z")
	check("UTC", 22*h, 24*h, "2026-03-13T00:00:00Z", "2026-03-13T22:00:00Z")
	check("UTC", 0, 0, "2026-03-13T03:00:00Z", "2026-03-13T03:00:00Z")
	check("UTC", 0, 24*h, "2026-03-13T03:00:00Z", "2026-03-13T03:00:00Z")
	// the wall clock counts, on either side of a change
	check("America/New_York", 7*h, 19*h, "2026-03-08T06:00:00Z", "2026-03-08T07:00:00-04:00")
	check("America/New_York", 7*h, 19*h, "2026-11-01T05:00:00Z", "2026-11-01T07:00:00-05:00")
	// an opening within a gap: the first minute that exists
	check("America/New_York", 2*h+30, 19*h, "2026-03-08T06:00:00Z", "2026-03-08T03:00:00-04:00")
	check("Australia/Lord_Howe", 2*h+15, 19*h, "2026-10-03T15:00:00Z", "2026-10-04T02:30:00+11:00")
	check("America/Santiago", 0*h+30, 19*h, "2026-09-06T03:00:00Z", "2026-09-06T01:00:00-03:00")
	// hours that lie wholly within a gap: the next day's
	check("America/New_York", 2*h, 3*h, "2026-03-08T06:30:00Z", "2026-03-09T02:00:00-04:00")
	// an opening that comes twice: the first time, and again when the hours come twice
	check("America/New_York", 1*h, 1*h+30, "2026-11-01T04:00:00Z", "2026-11-01T01:00:00-04:00")
	check("America/New_York", 1*h, 1*h+30, "2026-11-01T05:45:00Z", "2026-11-01T01:00:00-05:00")
	// a zone a quarter of an hour off
	check("Asia/Kathmandu", 7*h, 19*h, "2026-03-13T00:00:00Z", "2026-03-13T07:00:00+05:45")
}

// A notice is never held for longer than until the same time of the next day, and never brought forward.
func TestOpeningIsTheFirst(t *testing.T) {
	z, err := time.LoadLocation("Europe/London")
	if err != nil {
		t.Fatal(err)
	}
	for from := 0; from < 1440; from += 97 {
		for to := 1; to <= 1440; to += 131 {
			h := Hours{from, to, z}
			at := time.Date(2026, 3, 28, 0, 0, 30, 0, z)
			for range 60 {
				got := h.Opening(at)
				if got.Before(at) || from != to && !h.open(got) {
					t.Fatalf("%d-%d at %s: %s", from, to, at, got)
				}
				for m := at; m.Before(got); m = m.Add(time.Minute) {
					if h.open(m) {
						t.Fatalf("%d-%d at %s: open at %s, before %s", from, to, at, m, got)
					}
				}
				at = at.Add(53 * time.Minute)
			}
		}
	}
}
