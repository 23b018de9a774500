package stats_test

import (
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/stats"
)

// TestSortedAgainstLists: median, MAD, ranks and order statistics against counting and sorting again.
func TestSortedAgainstLists(t *testing.T) {
	for seed := range uint64(400) {
		r := rand.New(rand.NewPCG(seed, 41))
		var list []int64
		for range 1 + r.IntN(40) {
			list = append(list, regimes[int(seed)%len(regimes)](r))
		}
		w := stats.SortedOf(list)
		median, _ := w.Median(one)
		mad, _ := w.MAD(one)
		if off := ulps(t, median, quotient(big.NewInt(medianTwice(list)), big.NewInt(2)), one); !(off <= 0.501) {
			t.Errorf("seed %d: median %v is %v ulp off", seed, median, off)
		}
		if off := ulps(t, mad, quotient(big.NewInt(madFourTimes(list)), big.NewInt(4)), one); !(off <= 0.501) {
			t.Errorf("seed %d: MAD %v is %v ulp off", seed, mad, off)
		}
		k := list[r.IntN(len(list))] + r.Int64N(3) - 1
		atMost, atLeast := w.Ranks(k)
		wantMost, wantLeast := 0, 0
		for _, v := range list {
			if v <= k {
				wantMost++
			}
			if v >= k {
				wantLeast++
			}
		}
		if atMost != wantMost || atLeast != wantLeast {
			t.Errorf("seed %d: %d at most and %d at least %d, want %d and %d", seed, atMost, atLeast, k, wantMost, wantLeast)
		}
		if off := ulps(t, w.Distance(k, one), quotient(big.NewInt(2*k-medianTwice(list)), big.NewInt(2)), one); !(off <= 0.501) {
			t.Errorf("seed %d: distance %v is %v ulp off", seed, w.Distance(k, one), off)
		}
	}
}

func TestSortedWithoutValues(t *testing.T) {
	var w stats.Sorted
	if _, ok := w.Median(one); ok {
		t.Error("a median of nothing")
	}
	if _, ok := w.MAD(one); ok {
		t.Error("a MAD of nothing")
	}
	if _, _, ok := w.Lines(1); ok {
		t.Error("lines of nothing")
	}
	if _, ok := stats.Median(nil); ok {
		t.Error("a median of nothing")
	}
	if got := w.Distance(2e15, one); got != 2 {
		t.Errorf("distance from nothing: %v", got)
	}
}

// TestMedianOfFloats: worked by hand.
func TestMedianOfFloats(t *testing.T) {
	for want, values := range map[float64][]float64{
		5.5: {10, 1, 9, 2, 8, 3, 7, 4, 6, 5}, 3: {3}, 2: {1, 3, 2}, math.MaxFloat64: {math.MaxFloat64, math.MaxFloat64}, 0: {-math.MaxFloat64, math.MaxFloat64},
	} {
		before := slices.Clone(values)
		if got, ok := stats.Median(values); got != want || !ok || !slices.Equal(values, before) {
			t.Errorf("median of %v: %v, want %v", before, got, want)
		}
	}
}

// TestQuantileOfType7: worked by hand from the definition.
func TestQuantileOfType7(t *testing.T) {
	ten := []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}
	for p, want := range map[float64]float64{0: 1, 0.25: 3.25, 0.5: 5.5, 0.75: 7.75, 1: 10, 0.9: 9.1} {
		got, err := stats.Quantile(ten, p)
		if err != nil {
			t.Error(err)
		}
		near(t, fmt.Sprintf("quantile %v", p), got, want, 1e-15)
	}
	wide := []float64{-math.MaxFloat64, math.MaxFloat64}
	if got, err := stats.Quantile(wide, 0.5); got != 0 || err != nil {
		t.Errorf("the middle of the floats: %v, %v", got, err)
	}
	for _, p := range []float64{-0.1, 1.1, math.NaN()} {
		if _, err := stats.Quantile(ten, p); err == nil {
			t.Errorf("quantile %v: want an error", p)
		}
	}
	if _, err := stats.Quantile(nil, 0.5); err == nil {
		t.Error("a quantile of nothing: want an error")
	}
}

// TestRankMarkAtMultiples: floor(level (n+1)/2) in rational arithmetic, at the exact multiples where floats fall short.
func TestRankMarkAtMultiples(t *testing.T) {
	for _, n := range []int{19, 59, 60, 99, 199, 250, 251, 999, 1000, 32_768} {
		for m := 1; 2*m < n+1; m += 1 + n/100 {
			for side, tails := range map[stats.Side]int{stats.TwoSided: 2, stats.OneSided: 1} {
				level := float64(tails*m) / float64(n+1)
				for _, l := range []float64{level, 1 - (1 - level), math.Nextafter(level, 0)} {
					if got, ok := stats.RankMark(l, n, side); got != m || !ok {
						t.Errorf("n=%d level=%v (%d tails): mark %d %v, want %d", n, l, tails, got, ok, m)
					}
				}
				if got, ok := stats.RankMark(level*(1-1e-9), n, side); got != m-1 || ok != (m > 1) {
					t.Errorf("n=%d level just below %v: mark %d %v, want %d", n, level, got, ok, m-1)
				}
			}
		}
	}
	for _, bad := range []float64{0, -1, 1, math.NaN(), 0.0027} {
		if m, ok := stats.RankMark(bad, 250, stats.TwoSided); ok { // 0.27 % is below the floor 2/251
			t.Errorf("level %v: mark %d", bad, m)
		}
	}
}

// TestRankTailAgreesWithLines: beyond the mark-th order statistic is the same as a tail of at most the level.
func TestRankTailAgreesWithLines(t *testing.T) {
	for seed := range uint64(300) {
		r := rand.New(rand.NewPCG(seed, 43))
		n := 20 + r.IntN(250)
		p := stats.NewSortedPanel(1, n)
		for range n {
			p.Push([]int64{r.Int64N(100)}) // many ties
		}
		level := 2.0 / float64(n+1) * (1 + 10*r.Float64())
		mark, ok := stats.RankMark(level, n, stats.TwoSided)
		low, high, has := p.Sorted(0).Lines(mark)
		if !ok || !has {
			t.Fatalf("seed %d: no lines at level %v of %d", seed, level, n)
		}
		marks := make([]int, n+1)
		marks[n] = mark
		for k := int64(-1); k <= 100; k++ {
			atMost, atLeast := p.Sorted(0).Ranks(k)
			outside := stats.RankTail(atMost, atLeast, n) <= level
			if outside != (k < low || k > high) {
				t.Errorf("seed %d: %d has tail %v at level %v, lines %d to %d", seed, k, stats.RankTail(atMost, atLeast, n), level, low, high)
			}
			if named := len(p.ScanRank([]int64{k, stats.Missing}[:1], marks, nil)) == 1; named != outside {
				t.Errorf("seed %d: scan of %d: %v, want %v", seed, k, named, outside)
			}
		}
		if got := p.ScanRank([]int64{stats.Missing}, marks, nil); len(got) != 0 {
			t.Errorf("an absent value is named")
		}
		if got := p.ScanRank([]int64{50}, make([]int, n+1), nil); len(got) != 1 {
			t.Errorf("without lines every value is named: %v", got)
		}
	}
}

func BenchmarkSortedPanel(b *testing.B) {
	const series, window = 4080, 60
	r := rand.New(rand.NewPCG(1, 2))
	p := stats.NewSortedPanel(series, window)
	var cols [][]int64
	for range 64 {
		cols = append(cols, returns(r, series))
		p.Push(cols[len(cols)-1])
	}
	perValue := func(b *testing.B) {
		b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/series, "ns/value")
	}
	gate := stats.MADGate(window, 20, stats.Fixed(5))
	marks := slices.Repeat([]int{1}, window+1)
	b.Run("Scan", func(b *testing.B) {
		var cand []int32
		for i := 0; b.Loop(); i++ {
			cand = p.Scan(cols[i%len(cols)], gate, cand[:0])
		}
		perValue(b)
	})
	b.Run("ScanRank", func(b *testing.B) {
		var cand []int32
		for i := 0; b.Loop(); i++ {
			cand = p.ScanRank(cols[i%len(cols)], marks, cand[:0])
		}
		perValue(b)
	})
	b.Run("Push", func(b *testing.B) {
		for i := 0; b.Loop(); i++ {
			p.Push(cols[i%len(cols)])
		}
		perValue(b)
	})
}
