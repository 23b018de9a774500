package stats_test

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"strayd/stats"
)

const one = 1e15

// exactSums recomputes a window with math/big, 300 bits: n, mean and deviation in units.
type exactSums struct {
	n             int64
	sum, squares  *big.Int
	mean, spread  *big.Float
	spreadInteger *big.Int
}

func exactly(values []int64) exactSums {
	e := exactSums{n: int64(len(values)), sum: new(big.Int), squares: new(big.Int)}
	for _, k := range values {
		b := big.NewInt(k)
		e.sum.Add(e.sum, b)
		e.squares.Add(e.squares, new(big.Int).Mul(b, b))
	}
	n := big.NewInt(max(e.n, 1))
	e.spreadInteger = new(big.Int).Sub(new(big.Int).Mul(n, e.squares), new(big.Int).Mul(e.sum, e.sum))
	e.mean = quotient(e.sum, n)
	if e.n > 1 {
		e.spread = quotient(e.spreadInteger, new(big.Int).Mul(n, big.NewInt(e.n-1)))
		e.spread.Sqrt(e.spread)
	}
	return e
}

func quotient(a, b *big.Int) *big.Float {
	x := new(big.Float).SetPrec(300).SetInt(a)
	return x.Quo(x, new(big.Float).SetPrec(300).SetInt(b))
}

// The figures come out nearest to the exact value, or as near as 100 bits can tell: within 0.501 ulp. So they are the same on
// every machine.

// ulps is how many ulp got lies from the exact value/one.
func ulps(t testing.TB, got float64, value *big.Float, one float64) float64 {
	t.Helper()
	want := new(big.Float).SetPrec(300).Quo(value, big.NewFloat(one))
	nearest, _ := want.Float64()
	ulp := math.Nextafter(math.Abs(nearest), math.Inf(1)) - math.Abs(nearest)
	off, _ := want.Sub(want, big.NewFloat(got)).Float64()
	return math.Abs(off) / ulp
}

func checkSums(t *testing.T, what string, s stats.Sums, values []int64) {
	t.Helper()
	var again stats.Sums
	for _, k := range values {
		again.Add(k)
	}
	if s != again {
		t.Errorf("%s: sums %v, recomputed from nothing %v", what, s, again)
	}
	e := exactly(values)
	for _, scale := range []float64{one, 1, 10} {
		if e.n > 0 {
			if off := ulps(t, s.Mean(scale), e.mean, scale); !(off <= 0.501) {
				t.Errorf("%s: mean %v at scale %v is %.2f ulp off", what, s.Mean(scale), scale, off)
			}
		}
		got, ok := s.Deviation(scale)
		if ok != (e.n >= 2) {
			t.Errorf("%s: deviation of %d values: ok %v", what, e.n, ok)
		}
		if e.n < 2 {
			continue
		}
		if off := ulps(t, got, e.spread, scale); !(off <= 0.501) {
			t.Errorf("%s: deviation %v at scale %v is %.2f ulp off", what, got, scale, off)
		}
		if (got == 0) != (e.spreadInteger.Sign() == 0) {
			t.Errorf("%s: deviation %v, exact spread %v", what, got, e.spreadInteger)
		}
	}
}

// windows are the corners and the ordinary cases.
func windows(r *rand.Rand) map[string][]int64 {
	const top = stats.MaxValue
	fill := func(n int, f func(i int) int64) []int64 {
		w := make([]int64, n)
		for i := range w {
			w[i] = f(i)
		}
		return w
	}
	return map[string][]int64{
		"empty":               {},
		"one":                 {12345},
		"two equal":           {7, 7},
		"two a unit apart":    {top, top - 1},
		"constant zero":       fill(60, func(int) int64 { return 0 }),
		"all at the top":      fill(stats.MaxWindow, func(int) int64 { return top }),
		"all at the bottom":   fill(stats.MaxWindow, func(int) int64 { return -top }),
		"one off the top":     fill(stats.MaxWindow, func(i int) int64 { return top - int64(i/(stats.MaxWindow-1)) }),
		"alternating extreme": fill(stats.MaxWindow, func(i int) int64 { return top * int64(1-i%2*2) }),
		"a unit at the top":   fill(60, func(i int) int64 { return top - int64(i%2) }),
		"returns":             returns(r, 250),
		"spikes":              fill(250, func(i int) int64 { return r.Int64N(1e13) + top/100*int64(i%50/49) }),
		"any":                 fill(1000, func(int) int64 { return r.Int64N(2*top+1) - top }),
	}
}

func TestSumsAgainstExactArithmetic(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 5))
	for what, values := range windows(r) {
		var s stats.Sums
		for _, k := range values {
			s.Add(k)
		}
		checkSums(t, what, s, values)
	}
}

// TestMaxWindow holds the derivation at MaxWindow: the sum of squares fits 128 bits up to n = 34,028 and no further.
func TestMaxWindow(t *testing.T) {
	square := new(big.Int).Exp(big.NewInt(stats.MaxValue), big.NewInt(2), nil)
	for n, want := range map[int64]bool{stats.MaxWindow: true, 34_028: true, 34_029: false} {
		if fits := new(big.Int).Mul(square, big.NewInt(n)).BitLen() <= 128; fits != want {
			t.Errorf("%d squares of %d fit 128 bits: %v, want %v", n, int64(stats.MaxValue), fits, want)
		}
	}
}
