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

// studentFar is ln P(T >= t) for t^2 from 3 on. Abramowitz and Stegun 26.7.1:
//
//	P = I_x(df/2, 1/2)/2 = peak sqrt(df)/2 x^(df/2) sqrt(1-x) K,  x = df/(df+t^2), K the continued fraction
func studentFar(df, peak, t float64) float64 {
	w := t * t / df
	return math.Log(peak*math.Sqrt(df)/2) - df/2*lnRise(df, t) - math.Log1p(1/w)/2 + math.Log(betaFraction(df/2, w))
}

// lnRise is ln(1 + t^2/df), also where t^2 is beyond the floats.
func lnRise(df, t float64) float64 {
	w := t * t / df
	if w > 1e18 { // then 1+w is w
		return 2 * math.Log(t/math.Sqrt(df))
	}
	return math.Log1p(w)
}

// betaFraction is the continued fraction of the incomplete beta function I_x(a, b) for b = 1/2 and x = 1/(1+w): the even part of
// Abramowitz and Stegun 26.5.8, as DiDonato and Morris (1992, ACM Transactions on Mathematical Software 18:360-373, BFRAC)
// write it, so that nothing cancels where a is large and y = 1-x small:
//
//	K = 1/(beta(0) + alpha(1)/(beta(1) + alpha(2)/(beta(2) + ...)))
//	alpha(n) = n (b-n) x^2 (a+n-1)(a+b+n-1)/(a+2n-1)^2
//	beta(n)  = n + n (b-n) x/(a+2n-1) + (a+n)/(a+2n+1) ((a+b) y + 1-b + n (1+y))
//
// It is evaluated from the front by the method of Lentz (1976, Applied Optics 15:668-671).
func betaFraction(a, w float64) float64 {
	const b, terms = 0.5, 10_000
	x, y := 1/(1+w), 1/(1+1/w)
	f := a / (a + 1) * ((a+b)*y + 1 - b)
	c, d := f, 0.0
	for n := 1.0; n < terms; n++ {
		middle := a + 2*n - 1
		alpha := n * (b - n) * x * x * (a + n - 1) / middle * (a + b + n - 1) / middle
		beta := n + n*(b-n)*x/middle + (a+n)/(middle+2)*((a+b)*y+1-b+n*(1+y))
		d = 1 / (beta + alpha*d)
		c = beta + alpha/c
		f *= c * d
		if math.Abs(c*d-1) <= 3e-16 {
			break
		}
	}
	return 1 / f
}
