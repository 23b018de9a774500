package stats

import (
	"fmt"
	"math"
)

const (
	// SmallestTail stands for every tail probability below it: the smallest normal float64. The logarithm stays right.
	SmallestTail = 0x1p-1022
	// MaxDF is the greatest number of degrees of freedom.
	MaxDF = 1e6
)

// Tail is the distribution that turns a z-score into a tail probability and back. It is symmetric about 0. The zero Tail is the
// standard normal.
//
// Tails have a relative error below 1e-12 down to SmallestTail, their logarithms everywhere. A z of NaN or beyond the floats
// counts as the greatest float: it can never look ordinary. Logarithms below -math.MaxFloat64 are given as that.
type Tail struct {
	df     float64 // 0 for the normal
	factor float64 // from z to Student's t
	peak   float64 // density of Student's t at 0
}

// Normal is the standard normal.
func Normal() Tail { return Tail{} }

// RawT is Student's t as it stands, for predictive tails with df = n-1. df is from 1 to MaxDF.
func RawT(df float64) (Tail, error) {
	if !(df >= 1 && df <= MaxDF) {
		return Tail{}, fmt.Errorf("degrees of freedom %v: need 1 to %d", df, int(MaxDF))
	}
	return Tail{df: df, factor: 1, peak: peak(df)}, nil
}

// ScaledT is Student's t scaled to unit variance: t = z sqrt(df/(df-2)). df is above 2, at most MaxDF.
func ScaledT(df float64) (Tail, error) {
	if !(df > 2 && df <= MaxDF) {
		return Tail{}, fmt.Errorf("degrees of freedom %v of a t scaled to unit variance: need more than 2, at most %d", df, int(MaxDF))
	}
	return Tail{df: df, factor: math.Sqrt(df / (df - 2)), peak: peak(df)}, nil
}

// half is the probability on one side of a z >= 0, kept so that neither end loses its digits.
type half struct {
	near  bool
	inner float64 // P(0 <= Z < z), where near
	p, ln float64 // P(Z >= z) and its natural logarithm, where not near; p may be 0
}

func (t Tail) half(z float64) half {
	if t.df == 0 {
		return normalHalf(z)
	}
	return studentHalf(t.df, t.peak, min(z*t.factor, math.MaxFloat64))
}

// Upper is P(Z >= z) and its decimal logarithm.
func (t Tail) Upper(z float64) (p, log10 float64) {
	z = clampZ(z)
	if z < 0 {
		q, _ := t.Upper(-z)
		return sure(1-q, q)
	}
	h := t.half(z)
	if h.near {
		return 0.5 - h.inner, math.Log(0.5-h.inner) / math.Ln10
	}
	return tailOf(h.p, h.ln)
}

// Lower is P(Z <= z) and its decimal logarithm.
func (t Tail) Lower(z float64) (p, log10 float64) { return t.Upper(-z) }

// TwoSided is P(|Z| >= |z|) and its decimal logarithm.
func (t Tail) TwoSided(z float64) (p, log10 float64) {
	h := t.half(math.Abs(clampZ(z)))
	if h.near {
		return sure(1-2*h.inner, 2*h.inner)
	}
	return tailOf(2*h.p, h.ln+math.Ln2)
}

func clampZ(z float64) float64 {
	if math.IsNaN(z) {
		return math.MaxFloat64
	}
	return max(-math.MaxFloat64, min(z, math.MaxFloat64))
}

// sure is a probability p near 1 with its logarithm from the rest q = 1-p.
func sure(p, q float64) (float64, float64) {
	if q == 0 {
		return 1, 0
	}
	return p, math.Log1p(-q) / math.Ln10
}

func tailOf(p, ln float64) (float64, float64) {
	return max(p, SmallestTail), max(ln/math.Ln10, -math.MaxFloat64)
}
