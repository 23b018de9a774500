package rules

import (
	"cmp"
	"fmt"
	"math"
	"slices"
)

// The limits of `misfit`. A rank correlation of 0.70 is where regulators have a model fail against what it stands for (Basel Committee,
// d457, MAR32: profit and loss attribution, red zone); how far it must have been above before is common practice, no source.
const (
	fitFall      = 0.3
	fitRank      = 0.7
	fitRankAbove = 0.85
)

// Grasp is how well a reference explains a series: the share of the variance, 1 - var(residual)/var(return), and Spearman's rank correlation
// of the return and what the reference foresees of it.
type Grasp struct{ Explained, Rank float64 }

// GraspOf is that of returns and their residuals; ok is false where returns are all the same.
func GraspOf(returns, residuals []float64) (f Grasp, ok bool) {
	_, all := newRunning(returns).of(0, len(returns))
	_, left := newRunning(residuals).of(0, len(residuals))
	if all <= ScaleFloor {
		return f, false
	}
	foreseen := make([]float64, len(returns))
	for i, x := range returns {
		foreseen[i] = x - residuals[i]
	}
	f.Explained = max(0, 1-float64(left*left)/float64(all*all))
	f.Rank, ok = Spearman(returns, foreseen)
	return f, ok
}

// misfit looks for a reference that explains the newest 60 observations much worse than the up to 190 before them.
func (p *SlowPast) misfit() (SlowFinding, bool) {
	n := len(p.Residuals) - slowShort
	if n < SlowLeast {
		return SlowFinding{}, false
	}
	from := max(0, n+slowShort-slowLong)
	before, ok := GraspOf(p.Returns[from:n], p.Residuals[from:n])
	now, okNow := GraspOf(p.Returns[n:], p.Residuals[n:])
	fell := before.Explained-now.Explained > fitFall || now.Rank < fitRank && before.Rank >= fitRankAbove
	if !ok || !okNow || !fell {
		return SlowFinding{}, false
	}
	return SlowFinding{Kind: KindMisfit, Note: fmt.Sprintf(
		"its reference explains %.0f %% of the variance of the last %d observations, of the %d before %.0f %%; rank correlation %.2f, before %.2f",
		100*now.Explained, slowShort, n-from, 100*before.Explained, now.Rank, before.Rank)}, true
}

// Spearman is the rank correlation of two lists of one length, equal values sharing their mean rank; ok is false where either is constant.
func Spearman(x, y []float64) (r float64, ok bool) {
	a, b := ranks(x), ranks(y)
	middle := float64(len(x)-1) / 2
	var ab, aa, bb float64
	for i := range a {
		u, v := a[i]-middle, b[i]-middle
		ab, aa, bb = ab+float64(u*v), aa+float64(u*u), bb+float64(v*v)
	}
	if aa == 0 || bb == 0 {
		return 0, false
	}
	return ab / math.Sqrt(float64(aa*bb)), true
}

// ranks are from 0, equal values at the mean of theirs.
func ranks(values []float64) []float64 {
	order := make([]int, len(values))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(i, k int) int { return cmp.Or(cmp.Compare(values[i], values[k]), cmp.Compare(i, k)) })
	out := make([]float64, len(values))
	for from := 0; from < len(order); {
		to := from + 1
		for to < len(order) && values[order[to]] == values[order[from]] {
			to++
		}
		for _, i := range order[from:to] {
			out[i] = float64(from+to-1) / 2
		}
		from = to
	}
	return out
}
