package stats

import "math"

// peak is the density of Student's t at 0:
//
//	Gamma((df+1)/2) / (sqrt(df pi) Gamma(df/2))
func peak(df float64) float64 { return gammaStep(df/2) / math.Sqrt(df*math.Pi) }

// gammaStep is Gamma(a+1/2)/Gamma(a) for a > 0. From a = 30 on by the series that follows from Stirling's (Abramowitz and Stegun
// 6.1.41):
//
//	ln(Gamma(a+1/2)/Gamma(a)) = ln(a)/2 - 1/(8a) + 1/(192a^3) - 1/(640a^5) + 17/(14336a^7) - ...
//
// and below by Gamma(a+1) = a Gamma(a). The difference of two logarithms of Gamma would lose its digits for large a.
func gammaStep(a float64) float64 {
	down := 1.0
	for ; a < 30; a++ {
		down *= a / (a + 0.5)
	}
	inverse := 1 / (a * a)
	series := -1.0/8 + inverse*(1.0/192+inverse*(-1.0/640+inverse*(17.0/14336-inverse*31/18432)))
	return down * math.Sqrt(a) * math.Exp(series/a)
}

// studentHalf is the half of Student's t beyond t >= 0.
func studentHalf(df, peak, t float64) half {
	if t*t < 3 {
		return half{near: true, inner: studentInner(df, peak, t)}
	}
	ln := studentFar(df, peak, t)
	return half{p: math.Exp(ln), ln: ln}
}

// studentInner is P(0 <= T < t) for t^2 up to 3, by a series of positive terms (Abramowitz and Stegun 26.7.1 with the
// transformation 15.3.4 of its hypergeometric form):
//
//	t peak (1-y)^((df+1)/2) F(1, (df+1)/2; 3/2; y),  y = t^2/(df+t^2)
func studentInner(df, peak, t float64) float64 {
	square := t * t
	y := square / (df + square)
	sum, term := 1.0, 1.0
	for k := 0.0; term > 1e-17*sum; k++ {
		term *= ((df+1)/2 + k) / (1.5 + k) * y
		sum += term
	}
	return t * peak * math.Exp(-(df+1)/2*lnRise(df, t)) * sum
}

// studentFar is ln P(T >= t) for t^2 from 3 on. Abramowitz and Stegun 26.7.1 and 26.5.8:
//
//	P = I_x(df/2, 1/2)/2 = peak/sqrt(df) x^(df/2) sqrt(1-x) F,  x = df/(df+t^2), F the continued fraction
func studentFar(df, peak, t float64) float64 {
	w := t * t / df
	return math.Log(peak) - math.Log(df)/2 - df/2*lnRise(df, t) - math.Log1p(1/w)/2 + math.Log(betaFraction(df/2, 1/(1+w)))
}

// lnRise is ln(1 + t^2/df), also where t^2 is beyond the floats.
func lnRise(df, t float64) float64 {
	w := t * t / df
	if w > 1e18 { // then 1+w is w
		return 2 * math.Log(t/math.Sqrt(df))
	}
	return math.Log1p(w)
}

// betaFraction is the continued fraction of the incomplete beta function with b = 1/2 (Abramowitz and Stegun 26.5.8), evaluated
// from the front by the method of Lentz (1976, Applied Optics 15:668-671) as Thompson and Barnett (1986) modified it:
//
//	1/(1 + d1/(1 + d2/(1 + ...)))
//	d(2m) = m (b-m) x/((a+2m-1)(a+2m)),  d(2m+1) = -(a+m)(a+b+m) x/((a+2m)(a+2m+1))
//
// It converges for x < (a+1)/(a+b+2) within about sqrt(a) terms.
func betaFraction(a, x float64) float64 {
	const b, terms = 0.5, 100_000
	f, c, d := 1.0, 1.0, 0.0
	for m := 0.0; m < terms; m++ {
		if m > 0 {
			f, c, d = lentz(f, c, d, m*(b-m)*x/((a+2*m-1)*(a+2*m)))
		}
		f, c, d = lentz(f, c, d, -(a+m)*(a+b+m)*x/((a+2*m)*(a+2*m+1)))
		if math.Abs(c*d-1) <= 3e-16 {
			break
		}
	}
	return 1 / f
}

func lentz(f, c, d, term float64) (float64, float64, float64) {
	d = 1 / (1 + term*d)
	c = 1 + term/c
	return f * c * d, c, d
}
