package main

import (
	"math"
	"slices"

	"strayd/rules"
)

// rankBy judges by order statistics: the tail is twice the smaller of (n_le+1)/(n+1) and (n_ge+1)/(n+1), at most 1; a line at level p
// is the order statistic at which the tail first falls to p or below, just beyond.
func rankBy(r *oracleRange, v *oracleVerdict, values []rules.Units, x rules.Units) {
	sorted := slices.Sorted(slices.Values(values))
	tailOf := func(x rules.Units) float64 {
		le, ge := 0, 0
		for _, w := range sorted {
			if w <= x {
				le++
			}
			if w >= x {
				ge++
			}
		}
		n := float64(len(sorted))
		down, up := float64(le+1)/(n+1), float64(ge+1)/(n+1)
		switch r.side {
		case "lower":
			return down
		case "upper":
			return up
		}
		return min(1, 2*min(down, up))
	}
	v.tail = tailOf(x)
	v.log10 = math.Log10(v.tail)
	if v.finding == "not judged" {
		return
	}
	// A value beyond every one of the window has the smallest tail there is.
	floor := 1 / float64(len(sorted)+1)
	if r.side == "both" {
		floor *= 2
	}
	if r.breach.p < floor-1e-15 {
		v.finding = "not judged"
		return
	}
	v.low, v.high = rankLines(r, sorted, r.breach.p)
	v.watchLow, v.watchHigh = rankLines(r, sorted, r.watch.p)
	switch {
	case v.tail <= r.breach.p+1e-15:
		v.finding = "breach"
	case v.tail <= r.watch.p+1e-15:
		v.finding = "watch"
	}
}

// rankLines are the order statistics beyond which the tail is at most p: with k-1 values allowed beyond or at, the k-th from each end.
func rankLines(r *oracleRange, sorted []rules.Units, p float64) (low, high float64) {
	low, high = math.NaN(), math.NaN()
	n := len(sorted)
	if r.side == "both" {
		p /= 2
	}
	k := int(math.Floor(p*float64(n+1) + 1e-9)) // (k-1 values at or beyond) + 1 <= p (n+1)
	if k < 1 {
		return low, high
	}
	if r.side != "upper" {
		low = float64(sorted[k-1]) / 1e15
	}
	if r.side != "lower" {
		high = float64(sorted[n-k]) / 1e15
	}
	return low, high
}
