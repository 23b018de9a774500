package stats_test

import (
	"fmt"
	"math"
	"testing"

	"strayd/stats"
)

// TestComplement: one less a decimal is the decimal that a person would write.
func TestComplement(t *testing.T) {
	for x, want := range map[float64]float64{0.9973: 0.0027, 0.0027: 0.9973, 0.99: 0.01, 0.9: 0.1, 0.95: 0.05, 0.999: 0.001, 0.5: 0.5, 0: 1, 1: 0,
		1e-300: 1, 0.9995: 0.0005, 0.98: 0.02} {
		if got := stats.Complement(x); got != want {
			t.Errorf("1 - %v: %v, want %v", x, got, want)
		}
	}
}

// TestLinesAgree: each way of saying a line leads to the others.
func TestLinesAgree(t *testing.T) {
	for _, tail := range []stats.Tail{stats.Normal(), scaledT(t, 5), rawT(t, 59)} {
		for _, side := range []stats.Side{stats.TwoSided, stats.OneSided} {
			for _, level := range []float64{0.4, 0.05, 0.01, 0.0027, 0.0005, 1e-12} {
				byTail, err := tail.LineOfTail(level, side)
				if err != nil {
					t.Fatal(err)
				}
				byConfidence, err := tail.LineOfConfidence(byTail.Confidence, side)
				if err != nil {
					t.Fatal(err)
				}
				byZ, err := tail.LineOfZ(byTail.Z, side)
				if err != nil {
					t.Fatal(err)
				}
				name := fmt.Sprintf("%+v %v %v", tail, side, level)
				if level > 1e-9 { // a confidence next to 1 has no digits left for its tail
					near(t, name+" by confidence", byConfidence.Z, byTail.Z, 1e-12)
				}
				near(t, name+" by z", byZ.Tail, level, 2e-12)
				near(t, name+" days", byZ.Days, 1/level, 2e-12)
			}
		}
	}
}

func TestLinesOutOfDomain(t *testing.T) {
	for _, v := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if l, err := stats.Normal().LineOfTail(v, stats.TwoSided); err == nil {
			t.Errorf("tail %v: %v", v, l)
		}
		if l, err := stats.Normal().LineOfConfidence(v, stats.TwoSided); err == nil {
			t.Errorf("confidence %v: %v", v, l)
		}
		if l, err := stats.Normal().LineOfZ(v, stats.TwoSided); err == nil {
			t.Errorf("z %v: %v", v, l)
		}
	}
	if l, err := stats.Normal().LineOfConfidence(1, stats.TwoSided); err == nil {
		t.Errorf("confidence 1: %v", l)
	}
	for _, z := range []float64{1e-12, 1e300} {
		l, err := stats.Normal().LineOfZ(z, stats.TwoSided)
		if err != nil || !(l.Tail > 0 && l.Tail <= 1 && l.Days >= 1 && !math.IsInf(l.Days, 0) && l.Confidence >= 0 && l.Confidence <= 1) {
			t.Errorf("line at z %v: %+v, %v", z, l, err)
		}
	}
}
