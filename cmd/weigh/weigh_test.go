package main

import (
	"math"
	"testing"

	"strayd/rules/drill"
)

// margins are what a row may fall short of its floor by, in per cent, beside three deviations of its count: what a few books say of a share is
// rough. Rows that a pool alone cannot see are not planted.
const margin = 1.0

// The model of causes alone keeps the floors of the table on invented books, as far as a few books can tell, and what it flags on untouched
// days stays within 1.5 times the configured share. The command prints the whole table; -seeds 8 is the one that counts.
func TestFloorsOfTheModel(t *testing.T) {
	seeds := uint64(6)
	if testing.Short() {
		seeds = 2
	}
	sum := newTally()
	for s := range seeds {
		sum.book(100 + s)
	}
	for i, f := range drill.Floors() {
		r := &sum.rows[i]
		if r.Planted == 0 {
			continue
		}
		atLeast(t, f.Name+", caught", f.CaughtIn(r), r.Planted, f.Caught)
		atLeast(t, f.Name+", rightly named", r.Right, r.FiveDays, f.Right)
		if f.Wrong > 0 {
			atLeast(t, f.Name+", not wrongly named", r.FiveDays-r.Wrong, r.FiveDays, 100-f.Wrong)
		}
		if days := float64(r.Planted); f.Followed > 0 && float64(r.Followed) > f.Followed*days+3*math.Sqrt(f.Followed*days) {
			t.Errorf("%s: %d flags on followers in %d days, at most %v a day", f.Name, r.Followed, r.Planted, f.Followed)
		}
	}
	if q := sum.quiet[0]; float64(q.Flags) > 1.5*q.Promised+3*math.Sqrt(q.Promised) {
		t.Errorf("%s: %d flags on untouched days, %.0f promised", q.Name, q.Flags, q.Promised)
	}
	if t.Failed() {
		t.Logf("\n%s", sum)
	}
}

func atLeast(t *testing.T, name string, n, of int, floor float64) {
	t.Helper()
	want := floor / 100 * float64(of)
	slack := 3*math.Sqrt(float64(of)*floor/100*(1-floor/100)) + margin/100*float64(of)
	if float64(n) < want-slack {
		t.Errorf("%s: %d of %d, want %.1f %%", name, n, of, floor)
	}
}
