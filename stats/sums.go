package stats

import "math"

const (
	// Missing stands in a row of values where a series has none.
	Missing = math.MinInt64
	// MaxValue is the greatest size of a value that may enter a window.
	MaxValue = 100_000_000_000_000_000
	// MaxWindow is the most values that a window may hold. With |k| <= MaxValue = 10^17 the sum of squares stays below 2^128
	// up to n = 34,028 (2^128 = 3.4028e38); 32,768 is the power of two below it. The sum then stays below 3.3e21 < 2^72, and
	// n sum(k^2) and (sum k)^2 below 2^15 2^128 = 2^143, which three words hold.
	MaxWindow = 32_768
)

// Sums are the exact sums of one window: how many values, their sum and the sum of their squares. The zero Sums is the empty
// window. Two Sums over the same values are equal with ==, whatever the order and the detours by which the values came in.
type Sums struct {
	N int
	S Int128
	Q Uint128
}

// Add takes k into the window. At most MaxWindow values, each at most MaxValue in size.
func (s *Sums) Add(k int64) {
	s.N++
	s.S = s.S.add(k)
	s.Q = s.Q.add(square(k))
}

// Drop takes k, which must be in the window, out of it.
func (s *Sums) Drop(k int64) {
	s.N--
	s.S = s.S.add(-k)
	s.Q = s.Q.sub(square(k))
}

// spread is D = n sum(k^2) - (sum k)^2, exactly. It is 0 when and only when all values are equal.
func (s Sums) spread() uint192 {
	return s.Q.times(uint64(s.N)).sub(s.S.abs().square())
}

// offset is n k - sum(k), exactly: n times the distance of k from the mean.
func (s Sums) offset(k int64) Int128 { return product(int64(s.N), k).sub(s.S) }

// Mean is the mean of the values where one units make 1, nearest float (0.501 ulp); 0 for the empty window.
//
//	mean = sum(k) / (n one)
func (s Sums) Mean(one float64) float64 {
	if s.N == 0 {
		return 0
	}
	return s.S.pair().over(float64(s.N)).over(one).float()
}

// Deviation is the sample deviation (divisor n-1) where one units make 1, nearest float (0.501 ulp), and exactly 0 when all
// values are equal. ok is false below two values.
//
//	deviation = sqrt(D / (n (n-1))) / one,  D = n sum(k^2) - (sum k)^2
func (s Sums) Deviation(one float64) (deviation float64, ok bool) {
	if s.N < 2 {
		return 0, false
	}
	n := float64(s.N)
	return s.spread().pair().over(n * (n - 1)).root().over(one).float(), true
}

// Distance is how far k lies from the mean, where one units make 1, nearest float (0.501 ulp): the difference is taken in
// integers, so nothing cancels. For the empty window it is the value itself.
//
//	x - mean = (n k - sum(k)) / (n one)
func (s Sums) Distance(k int64, one float64) float64 {
	if s.N == 0 {
		return float64(k) / one
	}
	return s.offset(k).pair().over(float64(s.N)).over(one).float()
}
