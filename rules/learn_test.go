package rules_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"strayd/rules"
)

// student draws Student's t scaled to unit variance, a normal over the root of a chi-square (any textbook); infinity is the normal.
func student(r *rand.Rand, df int) float64 {
	if df == 0 {
		return r.NormFloat64()
	}
	chi := 0.0
	for range df {
		x := r.NormFloat64()
		chi += x * x
	}
	return r.NormFloat64() / math.Sqrt(chi/float64(df)) * math.Sqrt(float64(df-2)/float64(df))
}

// The tail that a group shows is learnt, and with it the line of 0.27 % holds what it promises within half as much again, on values that nothing
// was learnt from.
func TestTailsAreLearnt(t *testing.T) {
	const seed, series, past, then = 17, 20, 400, 400
	r := rand.New(rand.NewPCG(seed, 1))
	for _, c := range []struct {
		df        int // of the draws, 0 for the normal distribution
		low, high float64
	}{{3, 3, 4}, {5, 4, 6}, {0, 8, math.Inf(1)}} {
		for _, scale := range []rules.Scale{rules.Plain, rules.Weighted, rules.MAD} {
			rng := rules.Range{Name: "own", Of: rules.Return, Window: 60, Scale: scale, Decay: 0.97, Tail: rules.TailModel{Name: rules.Auto}, Predictive: true,
				Side: rules.Both, Watch: rules.Line{Tail: 0.01}, Breach: rules.Line{Tail: 0.0027}}
			g, err := rules.NewGauge(rng)
			if err != nil {
				t.Fatal(err)
			}
			var learnt, later rules.Exceedances
			for range series {
				values := make([]float64, past+then)
				for i := range values {
					values[i] = 0.01 * student(r, c.df)
				}
				learnt.Add(&rng, values[:past])
				later.Add(&rng, values[past:])
			}
			df := learnt.DF()
			t.Logf("seed %d: t%d, %s: learnt %g of %d values", seed, c.df, scale, df, learnt.N)
			if scale == rules.Plain && (df < c.low || df > c.high) {
				t.Errorf("t%d, %s: learnt %g", c.df, scale, df)
			}
			if got, want := breaches(g, df, &later), 0.0027*float64(later.N); scale == rules.Plain && got > 1.5*want+3*math.Sqrt(want) {
				t.Errorf("t%d, %s: %.0f beyond the line, %.0f promised", c.df, scale, got, want)
			}
		}
	}
	var few rules.Exceedances
	few.N = rules.LearntFrom - 1
	if few.DF() != 5 {
		t.Errorf("too few values give %g", few.DF())
	}
}

// breaches is how many of the counted values lie beyond the breach line of learnt degrees of freedom, between two of the counted lines on a
// power law.
func breaches(g *rules.Gauge, df float64, e *rules.Exceedances) float64 {
	past, _ := swing(60, 100)
	past.DF = df
	v := g.Expect(past)
	line := (v.High.V - v.Mean.V) / (v.Deviation.V * math.Sqrt(1+1.0/60))
	lines := [3]float64{3.123, 4.273, 5.332}
	for k := range 2 {
		a, b := math.Max(float64(e.Beyond[k]), 0.5), math.Max(float64(e.Beyond[k+1]), 0.5)
		if line <= lines[k+1] || k == 1 {
			share := (math.Log(line) - math.Log(lines[k])) / (math.Log(lines[k+1]) - math.Log(lines[k]))
			return math.Exp(math.Log(a) + share*(math.Log(b)-math.Log(a)))
		}
	}
	return 0
}
