package stats_test

import (
	"fmt"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/stats"
)

// replay is the state of a series that took values, from nothing.
func replay(values []int64, window int, decay, one float64) stats.Weighted {
	p := stats.NewWeightedPanel(1, window, decay, one)
	for _, k := range values {
		p.Push([]int64{k})
	}
	return p.State(0)
}

// TestWeightedReplay: a series among others, with gaps, cleared, exported and imported, has the state of its own replay.
func TestWeightedReplay(t *testing.T) {
	for seed, window := range []int{1, 2, 20, 60} {
		r := rand.New(rand.NewPCG(uint64(seed), 19))
		series := len(regimes)
		p := stats.NewWeightedPanel(series, window, 0.94, one)
		lists := make([][]int64, series)
		for range 200 {
			vals := column(r, series)
			before := slices.Clone(vals)
			p.Push(vals)
			if !slices.Equal(vals, before) {
				t.Fatal("an input was changed")
			}
			for i, k := range vals {
				if k != stats.Missing {
					lists[i] = append(lists[i], k)
				}
			}
			i := r.IntN(series)
			if r.IntN(20) == 0 {
				p.Clear(i)
				lists[i] = nil
			}
			if got, want := p.State(i), replay(lists[i], window, 0.94, one); got != want || p.N(i) != len(lists[i]) {
				t.Fatalf("seed %d series %d: %v, replayed %v", seed, i, got, want)
			}
			state := p.State(i)
			p.Clear(i)
			p.SetState(i, state)
		}
		p.Reset()
		if p.State(0) != (stats.Weighted{}) {
			t.Errorf("state %v after a reset", p.State(0))
		}
	}
}

// TestWeightedSeed: over the first window values the variance is their mean square, within an ulp of the exact one.
func TestWeightedSeed(t *testing.T) {
	r := rand.New(rand.NewPCG(23, 29))
	p := stats.NewWeightedPanel(len(regimes), 60, 0.94, one)
	squares := make([]big.Int, len(regimes))
	unitsSquared := new(big.Int).Exp(big.NewInt(10), big.NewInt(30), nil) // one^2, which no float is
	n := make([]int64, len(regimes))
	for range 60 {
		vals := column(r, len(regimes))
		p.Push(vals)
		for i, k := range vals {
			if k == stats.Missing {
				continue
			}
			n[i]++
			b := big.NewInt(k)
			squares[i].Add(&squares[i], b.Mul(b, b))
			if off := ulps(t, p.State(i).V, quotient(&squares[i], new(big.Int).Mul(big.NewInt(n[i]), unitsSquared)), 1); !(off <= 0.501) {
				t.Errorf("series %d after %d: variance %v is %.2f ulp off", i, n[i], p.State(i).V, off)
			}
		}
	}
}

// TestWeightedScan holds the gate against exact arithmetic on the variance held.
func TestWeightedScan(t *testing.T) {
	const window, least = 5, 3
	r := rand.New(rand.NewPCG(31, 37))
	p := stats.NewWeightedPanel(len(regimes), window, 0.94, one)
	for range 400 {
		z := []float64{0.5, 1.96, 4.27}[r.IntN(3)]
		vals := column(r, len(regimes))
		for i := range vals {
			if deviation, _ := p.Deviation(i); r.IntN(2) == 0 {
				vals[i] = int64(z*deviation*one) + r.Int64N(3) - 1
			}
			if r.IntN(10) == 0 {
				vals[i] = (stats.MaxValue + 1) * (r.Int64N(2)*2 - 1)
			}
		}
		cand := p.Scan(vals, stats.WeightedGate(window, least, stats.Fixed(z)), nil)
		for i, k := range vals {
			if k == stats.Missing {
				continue
			}
			line := new(big.Rat).Mul(ratOf(z), ratOf(z))
			line.Mul(line, ratOf(p.State(i).V))
			x := ratio(k, one)
			x.Mul(x, x)
			named := slices.Contains(cand, int32(i))
			must := p.N(i) < least || x.Cmp(line) > 0 || k > stats.MaxValue || k < -stats.MaxValue || p.State(i).V == 0
			if must && !named {
				t.Fatalf("series %d: %d omitted at variance %v", i, k, p.State(i).V)
			}
			if inside := x.Cmp(line.Mul(line, ratio(999_999, 1_000_000))) < 0; inside && !must && named {
				t.Fatalf("series %d: %d is inside but named at variance %v", i, k, p.State(i).V)
			}
		}
		p.Push(column(r, len(regimes)))
	}
}

// TestPublishedRecursions: two textbook recursions, both seeded by the first square (window 1).
func TestPublishedRecursions(t *testing.T) {
	// Hull, Risk Management and Financial Institutions, example 5.2: 0.9, 1 %, then 2 % gives 0.00013. See worked/WORKED.md.
	p := stats.NewWeightedPanel(1, 1, 0.9, 100)
	p.Push([]int64{1})
	p.Push([]int64{2})
	near(t, "hull_ewma", p.State(0).V, 0.00013, 1e-15)

	// RiskMetrics Technical Document, 4th edition, tables 5.2 and 5.3, in percent: the published figures are from memory and look
	// truncated, so 1.5e-3 is allowed; the recomputed ones are exact decimals. See worked/WORKED.md.
	w := worked(t, "riskmetrics_recursion")
	returns := w.floats(t, "inputs", "r_percent")
	published, recomputed := w.floats(t, "published", "variance"), w.floats(t, "recomputed", "variance")
	p = stats.NewWeightedPanel(1, 1, 0.94, 1000)
	for i, r := range returns {
		p.Push([]int64{fixed(t, fmt.Sprint(r), 3)})
		near(t, fmt.Sprintf("riskmetrics row %d", i), p.State(0).V, recomputed[i], 1e-14)
		if off := p.State(0).V - published[i]; !(off < 1.5e-3 && off > -1.5e-3) {
			t.Errorf("riskmetrics row %d: %v, published %v", i, p.State(0).V, published[i])
		}
	}
}

func BenchmarkWeightedPanel(b *testing.B) {
	const series, window = 4080, 60
	r := rand.New(rand.NewPCG(1, 2))
	p := stats.NewWeightedPanel(series, window, 0.94, one)
	var cols [][]int64
	for range 64 {
		cols = append(cols, returns(r, series))
		p.Push(cols[len(cols)-1])
	}
	gate := stats.WeightedGate(window, 20, stats.Fixed(4))
	b.Run("Scan", func(b *testing.B) {
		var cand []int32
		for i := 0; b.Loop(); i++ {
			cand = p.Scan(cols[i%len(cols)], gate, cand[:0])
		}
		b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/series, "ns/value")
	})
	b.Run("Push", func(b *testing.B) {
		for i := 0; b.Loop(); i++ {
			p.Push(cols[i%len(cols)])
		}
		b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/series, "ns/value")
	})
}
