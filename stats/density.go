package stats

import "math"

// Density is the probability density at z: of the standard normal
//
//	exp(-z^2/2) / sqrt(2 pi)
//
// and of Student's t, with t = factor z,
//
//	factor Gamma((df+1)/2) / (sqrt(df pi) Gamma(df/2)) (1 + t^2/df)^(-(df+1)/2)
//
// (Abramowitz and Stegun 26.2.1 and 26.7.1). Relative error below 1e-12 where the result is a normal float.
func (t Tail) Density(z float64) float64 {
	z = clampZ(z)
	if t.df == 0 {
		return math.Exp(-z*z/2) / math.Sqrt(2*math.Pi)
	}
	return t.factor * t.peak * math.Exp(-(t.df+1)/2*lnRise(t.df, math.Min(math.Abs(z)*t.factor, math.MaxFloat64)))
}
