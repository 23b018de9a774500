package stats_test

import (
	"math/big"
	"math/rand/v2"
	"slices"

	"strayd/stats"
)

// model is a window kept the plain way: a list, oldest first.
type model struct {
	window int
	values []int64
}

func (m *model) push(k int64) {
	m.values = append(m.values, k)
	if len(m.values) > m.window {
		m.values = m.values[1:]
	}
}

func (m *model) prepend(k int64) {
	if len(m.values) < m.window {
		m.values = slices.Insert(m.values, 0, k)
	}
}

func (m *model) sums() (s stats.Sums) {
	for _, k := range m.values {
		s.Add(k)
	}
	return s
}

// regimes are the kinds of series that the properties are tried on: by what a value of them may be.
var regimes = []func(r *rand.Rand) int64{
	func(r *rand.Rand) int64 { return int64(r.NormFloat64() * 1e13) },
	func(r *rand.Rand) int64 { return 5e13 + r.Int64N(3) }, // a spread of a few units far from 0
	func(r *rand.Rand) int64 { return stats.MaxValue - r.Int64N(2) },
	func(r *rand.Rand) int64 { return (stats.MaxValue - r.Int64N(10)) * (r.Int64N(2)*2 - 1) },
	func(r *rand.Rand) int64 { return 1234 }, // constant
	func(r *rand.Rand) int64 { return r.Int64N(2*stats.MaxValue+1) - stats.MaxValue },
	func(r *rand.Rand) int64 { return int64(r.NormFloat64() * 1e16) },
	func(r *rand.Rand) int64 { return regimesAny(r) },
}

// regimesAny jumps between the sizes.
func regimesAny(r *rand.Rand) int64 {
	size := int64(1)
	for range r.IntN(18) {
		size *= 10
	}
	return r.Int64N(2*size+1) - size
}

// column has a value of regime i for series i, and now and then none.
func column(r *rand.Rand, series int) []int64 {
	vals := make([]int64, series)
	for i := range vals {
		vals[i] = regimes[i%len(regimes)](r)
		if r.IntN(8) == 0 {
			vals[i] = stats.Missing
		}
	}
	return vals
}

// probe is a value near one of the lines of a window, or anything at all, to be scanned but not taken.
func probe(r *rand.Rand, values []int64, z float64) int64 {
	if len(values) < 2 || r.IntN(4) == 0 {
		return []int64{0, stats.MaxValue, stats.MaxValue + 1, -stats.MaxValue - 1, stats.Missing + 1, 1<<63 - 1, stats.Missing}[r.IntN(7)]
	}
	e := exactly(values)
	at := new(big.Float).Mul(e.spread, big.NewFloat(z*(r.Float64()*2.2-1.1)))
	if r.IntN(2) == 0 {
		at.Mul(e.spread, big.NewFloat(z*float64(r.IntN(2)*2-1))) // on the line, to the unit
	}
	k, _ := at.Add(at, e.mean).Int64()
	return k + r.Int64N(5) - 2
}

func ratio(num, den int64) *big.Rat { return new(big.Rat).SetFrac64(num, den) }

func ratOf(x float64) *big.Rat { return new(big.Rat).SetFloat64(x) }

// plainShare is ((k-mean)/deviation)^2 / (z^2 factor) in exact arithmetic: above 1 is outside. nil where there is no judging.
func plainShare(values []int64, k int64, z float64, predictive bool) *big.Rat {
	e := exactly(values)
	if e.n < 2 || e.spreadInteger.Sign() == 0 {
		return nil
	}
	off := new(big.Int).Mul(big.NewInt(e.n), big.NewInt(k))
	off.Sub(off, e.sum)
	share := new(big.Rat).SetFrac(off.Mul(off, off), e.spreadInteger)
	top := e.n
	if predictive {
		top++
	}
	share.Mul(share, ratio(e.n-1, top))
	return share.Quo(share, new(big.Rat).Mul(ratOf(z), ratOf(z)))
}

// medianTwice and madFourTimes are whole numbers, from a sorted copy of the window and of its distances.
func medianTwice(values []int64) int64 {
	w := slices.Sorted(slices.Values(values))
	return w[(len(w)-1)/2] + w[len(w)/2]
}

func madFourTimes(values []int64) int64 {
	m := medianTwice(values)
	var far []int64
	for _, k := range values {
		far = append(far, max(2*k-m, m-2*k))
	}
	return medianTwice(far)
}

// madShare is |k - median| / (z 1.4826 MAD) in exact arithmetic.
func madShare(values []int64, k int64, z float64) *big.Rat {
	if len(values) == 0 || madFourTimes(values) == 0 {
		return nil
	}
	far := new(big.Int).Sub(new(big.Int).Lsh(big.NewInt(k), 1), big.NewInt(medianTwice(values)))
	share := new(big.Rat).SetFrac(far.Abs(far).Lsh(far, 1), big.NewInt(madFourTimes(values)))
	return share.Quo(share, new(big.Rat).Mul(ratOf(z), ratio(14826, 10000)))
}
