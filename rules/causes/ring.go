package causes

import (
	"math"

	"strayd/stats"
)

const (
	slots = 256 // of the rings of a series: more than span
	mask  = slots - 1

	scaleSlots = 128 // of a scale's: more than long
	scaleMask  = scaleSlots - 1

	span  = 250 // dates that slopes, rates and lines are learnt from
	guard = 60  // dates behind the scale that values are clipped by
	long  = 120 // dates of the longest scale
	short = 20
)

// Deviations enter the sums as whole numbers of this size, so that adding and dropping are exact. At most 1 in size, 120 squares of
// 1e16 stay below 2^63.
const fine = 1e8

// clipAt is how many robust deviations a number may count for.
const clipAt = 5

// scale follows the deviation of one stream of numbers about 0: returns, or residuals. It goes by dates, so that what it says depends on
// the last long + guard of them.
type scale struct {
	raw    [scaleSlots]float64 // by date, NaN where there is none
	cut    [scaleSlots]int32   // clipped, in 1/fine
	sorted []float64           // |raw| of the last guard dates, ascending
	n      [3]int              // of the last short, guard and long dates
	total  [3]int64
	square [3]int64
}

var boxes = [3]int{short, guard, long}

func newScale() scale {
	s := scale{sorted: make([]float64, 0, guard+1)}
	for i := range s.raw {
		s.raw[i] = math.NaN()
	}
	return s
}

// expire forgets what leaves the windows when date t is about to be judged.
func (s *scale) expire(t int) {
	for k, b := range boxes {
		if at := (t - b - 1) & scaleMask; s.raw[at] == s.raw[at] {
			s.n[k]--
			c := int64(s.cut[at])
			s.total[k] -= c
			s.square[k] -= c * c
		}
	}
	if x := s.raw[(t-guard-1)&scaleMask]; x == x {
		i := place(s.sorted, math.Abs(x))
		copy(s.sorted[i:], s.sorted[i+1:])
		s.sorted = s.sorted[:len(s.sorted)-1]
	}
	s.raw[t&scaleMask] = math.NaN()
}

// take enters the number of date t, clipped to five robust deviations unless it is to count in full. The bound goes by the numbers as
// they came, so it needs no earlier bound (Hampel 1974, JASA 69:383-393, for the median deviation).
func (s *scale) take(t int, e, bound float64, full bool) {
	e = min(max(e, -1), 1)
	c := e
	if !full && bound > 0 {
		c = min(max(e, -bound), bound)
	}
	at := t & scaleMask
	cut := int64(math.RoundToEven(c * fine))
	s.raw[at], s.cut[at] = e, int32(cut)
	for k := range boxes {
		s.n[k]++
		s.total[k] += cut
		s.square[k] += cut * cut
	}
	i := place(s.sorted, math.Abs(e))
	s.sorted = append(s.sorted, 0)
	copy(s.sorted[i+1:], s.sorted[i:])
	s.sorted[i] = math.Abs(e)
}

// place is the index of the first number that is not below x in an ascending row.
func place(sorted []float64, x float64) int {
	low, high := 0, len(sorted)
	for low < high {
		if mid := (low + high) / 2; sorted[mid] < x {
			low = mid + 1
		} else {
			high = mid
		}
	}
	return low
}

// bound is where values are clipped.
func (s *scale) bound() float64 { return boundOf(s.sorted) }

// boundOf is clipAt times 1.4826 median |e|; 0, for none, while there are fewer than ten.
func boundOf(sorted []float64) float64 {
	if len(sorted) < 10 {
		return 0
	}
	return clipAt * stats.NormalMAD * sorted[len(sorted)/2]
}

// mean is that of the last long dates, 0 while there are fewer than leastSeen.
func (s *scale) mean() float64 {
	if s.n[2] < leastSeen {
		return 0
	}
	return float64(s.total[2]) / (float64(s.n[2]) * fine)
}

// variance is a mixture of the mean squares about a centre over three spans, which follows clusters of volatility without a fit (Corsi
// 2009, Journal of Financial Econometrics 7:174-196). lent is the variance that a group lends while there are few.
func (s *scale) variance(centre, lent float64) float64 {
	var v, weight float64
	for k := range boxes {
		if s.n[k] >= 10 || s.n[k] == s.n[2] && s.n[k] > 0 {
			v += float64(mix[k] * s.meanSquare(k, centre))
			weight += mix[k]
		}
	}
	if weight == 0 {
		return lent
	}
	v /= weight
	if n := float64(s.n[2]); n < guard && lent > 0 {
		v = (float64(n*v) + float64(10*lent)) / (n + 10)
	}
	return v
}

// meanSquare is the mean of (x - centre)^2 over a box.
func (s *scale) meanSquare(k int, centre float64) float64 {
	n := float64(s.n[k])
	square := float64(s.square[k]) / (n * fine * fine)
	mean := float64(s.total[k]) / (n * fine)
	return max(square-float64(2*centre*mean)+float64(centre*centre), 0)
}

var mix = [3]float64{0.35, 0.35, 0.3}
