package rules

import (
	"testing"
	"time"
)

// The register of errors, worked out by hand: sizes against the group's figure, and hours from arrival to flag and decision.
func TestFound(t *testing.T) {
	f := weekOf(t)
	f.Groups = []Group{{Name: "equity", Materiality: 0.005}, {Name: "cash"}}
	for ref := uint64(1); ref <= 5; ref++ {
		g := raised(ref, string(rune('a'+ref)), "2026-03-10", "2026-03-10T06:00:00Z", t)
		g.Group, g.Return = "equity", Units(0.02*float64(One))
		f.Flags = append(f.Flags, g)
	}
	f.Flags[2].Group = "cash"
	corrected := func(ref uint64, at string, value float64) Entry {
		e := decided([]uint64{ref}, at, Corrected, DataError, "", t)
		e.Value = Units(value * float64(One))
		return e
	}
	f.Acts = []Entry{
		corrected(1, "2026-03-10T08:00:00Z", 0.015),  // 50 bp: at the figure
		corrected(2, "2026-03-10T10:00:00Z", 0.0151), // 49 bp: below
		corrected(3, "2026-03-10T12:00:00Z", 0.01),   // of a group without a figure
		decided([]uint64{4}, "2026-03-11T06:00:00Z", Erroneous, DataError, "found by client", t),
		decided([]uint64{5}, "2026-03-11T06:00:00Z", Genuine, KnownEvent, "", t),
	}
	f.Arrived = map[uint64]time.Time{1: instant(t, "2026-03-10T05:30:00Z"), 2: instant(t, "2026-03-10T06:00:00Z"), 4: instant(t, "2026-03-09T06:00:00Z")}
	x := f.Figures().Found
	if len(x.Errors) != 4 || x.Sized != 3 || x.Material != 1 || x.Below != 1 || x.Unset != 1 || x.Timed != 3 {
		t.Errorf("%+v: want 4 errors, 3 with a size, 1 material, 1 below, 1 without a figure, 3 timed", x)
	}
	if x.ToFlag != Some(0.5) || x.ToWord != Some(4) { // 0.5, 0, 24; 2.5, 4, 48
		t.Errorf("median hours %v to the flag and %v to the decision, want 0.5 and 4", x.ToFlag, x.ToWord)
	}
	if e := x.Errors[3]; e.Finder != FoundByClient || e.Size.OK || e.Material() || e.ToFlag != Some(24) {
		t.Errorf("%+v", e)
	}
}
