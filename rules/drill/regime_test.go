package drill

import (
	"math"
	"testing"
)

// The benchmark falls by four of its deviations; each fund that takes part keeps its residual, that is, what its line on the benchmark
// leaves of it, to within the last printed digit; the three others stand as their names say.
func TestMarketMovesAllButThree(t *testing.T) {
	b := Invent(Invention{Seed: 2})
	fits := NewFits(b)
	const at = 700
	moved, odd := b.Market(fits, at, "north", -4)
	if len(odd) != 3 {
		t.Fatalf("%d odd ones, want 3", len(odd))
	}
	var sq float64
	for i := at - 60; i < at; i++ {
		sq += b.Values[i][0].Float() * b.Values[i][0].Float()
	}
	fall := -4 * math.Sqrt(sq/60)
	if got := moved.Values[at][0].Float(); math.Abs(got-fall) > 1e-6 {
		t.Errorf("the benchmark returned %v, want %v", got, fall)
	}
	left := func(of *Book, s int) float64 {
		return of.Values[at][s].Float() - fits.Of[s].Beta*of.Values[at][0].Float()
	}
	for s := range b.Series {
		of := &b.Series[s]
		switch {
		case of.Group != "north" && s != 0:
			if moved.Values[at][s] != b.Values[at][s] {
				t.Errorf("%s moved", of.ID)
			}
		case s == odd[0] && moved.Values[at][s] != 0, s == odd[1] && moved.Values[at][s] < 0,
			s == odd[2] && left(moved, s) > left(b, s)-9*fits.Of[s].Deviation:
			t.Errorf("%s: %s does not stand out", of.ID, moved.Values[at][s])
		case of.Group == "north" && s != odd[0] && s != odd[1] && s != odd[2]:
			if math.Abs(left(moved, s)-left(b, s)) > 1.1e-4 {
				t.Errorf("%s: residual %v, before %v", of.ID, left(moved, s), left(b, s))
			}
		}
	}
	if none, _ := b.Market(fits, at, "nowhere", -4); none != nil {
		t.Error("a group that is not there moved")
	}
}

func TestLouderDoublesFromADateOn(t *testing.T) {
	b := Invent(Invention{Seed: 2, Days: 10})
	out := b.Louder(6)
	for at, row := range out.Values {
		for s, u := range row {
			if want := b.Values[at][s]; at < 6 && u != want || at >= 6 && u != 2*want {
				t.Fatalf("date %d series %d: %s from %s", at, s, u, want)
			}
		}
	}
}
