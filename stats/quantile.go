package stats

import (
	"fmt"
	"math"
)

// Quantile is the z whose upper tail is p: P(Z >= z) = p, with a relative error below 1e-12. It is an error when p is not from
// SmallestTail to below 1.
func (t Tail) Quantile(p float64) (float64, error) {
	if !(p >= SmallestTail && p < 1) {
		return 0, fmt.Errorf("tail probability %v: need %v to less than 1", p, SmallestTail)
	}
	if p > 0.5 {
		return -t.above(1 - p), nil
	}
	return t.above(p), nil
}

// above is the quantile for p up to 0.5.
func (t Tail) above(p float64) float64 {
	switch {
	case p == 0.5:
		return 0
	case t.df == 0:
		return normalQuantile(p)
	case p >= 0.25:
		return t.nearQuantile(0.5-p) / t.factor
	}
	return t.farQuantile(p) / t.factor
}

const maxSteps = 100

// nearQuantile is the t with P(0 <= T < t) = inner, up to 1/4, by Newton's method from inner/peak: the probability is concave in
// t, so every step stays below the root.
func (t Tail) nearQuantile(inner float64) float64 {
	x := inner / t.peak
	for range maxSteps {
		step := (inner - studentInner(t.df, t.peak, x)) / math.Exp(t.lnDensity(x))
		x += step
		if math.Abs(step) <= 1e-15*x {
			break
		}
	}
	return x
}

// farQuantile is the t with P(T >= t) = p, below 1/4, by Newton's method on the logarithm of the tail against the logarithm of t,
// where it falls ever more steeply: one step may pass the root, the others then approach it from above.
func (t Tail) farQuantile(p float64) float64 {
	target := math.Log(p)
	x := normalQuantile(p)
	for range maxSteps {
		ln := t.lnUpper(x)
		slope := -math.Exp(t.lnDensity(x) + math.Log(x) - ln) // d ln P / d ln t
		step := (target - ln) / slope
		x = min(x*math.Exp(step), math.MaxFloat64)
		if math.Abs(step) <= 1e-15 {
			break
		}
	}
	return x
}

// lnUpper is ln P(T >= x) for x > 0, on Student's scale.
func (t Tail) lnUpper(x float64) float64 {
	h := studentHalf(t.df, t.peak, x)
	if h.near {
		return math.Log(0.5 - h.inner)
	}
	return h.ln
}

// lnDensity is the logarithm of the density of Student's t at x >= 0.
func (t Tail) lnDensity(x float64) float64 {
	return math.Log(t.peak) - (t.df+1)/2*lnRise(t.df, x)
}
