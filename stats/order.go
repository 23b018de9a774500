package stats

import (
	"fmt"
	"math"
	"slices"
)

const (
	// NormalMAD is the customary factor from a median absolute deviation to the deviation of a normal distribution, as R's mad
	// uses it.
	NormalMAD = 1.4826
	// ExactNormalMAD is the factor in full, 1/Phi^-1(3/4). It differs from the customary one by 1.5e-6 of itself.
	ExactNormalMAD = 1.4826022185056018
)

// Sorted is a window in ascending order.
type Sorted []int64

// SortedOf is a sorted copy of the values.
func SortedOf(values []int64) Sorted {
	w := slices.Clone(values)
	slices.Sort(w)
	return w
}

// Median is the middle value, or the mean of the two middle ones, where one units make 1. ok is false without values.
func (w Sorted) Median(one float64) (median float64, ok bool) {
	if len(w) == 0 {
		return 0, false
	}
	return halved(w.median2()).over(one).float(), true
}

// MAD is the median of |k - median|, unscaled, where one units make 1. ok is false without values.
func (w Sorted) MAD(one float64) (mad float64, ok bool) {
	if len(w) == 0 {
		return 0, false
	}
	m := halved(w.mad4())
	return pair{m.hi / 2, m.lo / 2}.over(one).float(), true
}

// Distance is how far k lies from the median, where one units make 1: taken in integers, so nothing cancels. Without values it
// is the value itself.
func (w Sorted) Distance(k int64, one float64) float64 {
	if len(w) == 0 {
		return float64(k) / one
	}
	return halved(2*k - w.median2()).over(one).float()
}

// halved is twice/2 without rounding.
func halved(twice int64) pair {
	p := Int128{}.add(twice).pair()
	return pair{p.hi / 2, p.lo / 2}
}

// median2 is twice the median: a whole number. There is at least one value.
func (w Sorted) median2() int64 { return w[(len(w)-1)/2] + w[len(w)/2] }

// mad4 is four times the MAD: a whole number, below 2^60 for values up to MaxValue.
func (w Sorted) mad4() int64 {
	m := w.median2()
	return w.farther(m, (len(w)-1)/2) + w.farther(m, len(w)/2)
}

// farther is the rank-th smallest (from 0) of |2k - m| over the window, m being twice its median. The distances ascend to the
// left and to the right of the middle; the rank+1 smallest of both are rank+1 neighbours in the window, and of all such runs
// theirs is the one whose farther end is nearest.
func (w Sorted) farther(m int64, rank int) int64 {
	lo, hi := 0, len(w)-1-rank // the run starts in [lo, hi]
	for lo < hi {
		mid := (lo + hi) / 2
		if m-2*w[mid] > 2*w[mid+rank+1]-m {
			lo = mid + 1 // the run one further right drops its farthest value
		} else {
			hi = mid
		}
	}
	return max(m-2*w[lo], 2*w[lo+rank]-m)
}

func distance(a, b int64) int64 { return max(a-b, b-a) }

// Ranks counts the values at most and at least k.
func (w Sorted) Ranks(k int64) (atMost, atLeast int) {
	below, _ := slices.BinarySearch(w, k)
	atMost, _ = slices.BinarySearchFunc(w, k, func(v, k int64) int {
		if v <= k {
			return -1
		}
		return 1
	})
	return atMost, len(w) - below
}

// Lines are the order statistics that bound a range: the mark-th smallest and the mark-th greatest value. ok is false when
// mark is below 1 or the window has fewer than 2 mark - 1 values.
func (w Sorted) Lines(mark int) (low, high int64, ok bool) {
	if mark < 1 || len(w) < 2*mark-1 {
		return 0, 0, false
	}
	return w[mark-1], w[len(w)-mark], true
}

// Quantile is the quantile of type 7 (Hyndman and Fan 1996, The American Statistician 50:361-365, the definition of R and of
// spreadsheets) of ascending finite values:
//
//	h = (n-1) p;  x[floor(h)] + (h - floor(h)) (x[floor(h)+1] - x[floor(h)])
//
// It is an error when there are no values or p is not within 0 to 1.
func Quantile(ascending []float64, p float64) (float64, error) {
	if len(ascending) == 0 || !(p >= 0 && p <= 1) {
		return 0, fmt.Errorf("quantile %v of %d values: need a share from 0 to 1 and at least 1 value", p, len(ascending))
	}
	h := float64(len(ascending)-1) * p
	j := int(math.Floor(h))
	if j == len(ascending)-1 {
		return ascending[j], nil
	}
	share := h - float64(j)
	return float64((1-share)*ascending[j]) + float64(share*ascending[j+1]), nil
}

// Median is the middle value, or the mean of the two middle ones, of finite values in any order. ok is false without values.
func Median(values []float64) (median float64, ok bool) {
	n := len(values)
	if n == 0 {
		return 0, false
	}
	w := slices.Clone(values)
	slices.Sort(w)
	return float64(w[(n-1)/2]/2) + float64(w[n/2]/2), true
}
