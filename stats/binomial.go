package stats

import "math"

// BinomialAtMost is P(X <= hits) for X hits among n at a share p each, and SmallestTail where it is less. Errors as Kupiec.
func BinomialAtMost(hits, n int, p float64) (float64, error) {
	if err := checkTrials(hits, n, p); err != nil {
		return 0, err
	}
	return lowerTail(hits, n, p, 1-p), nil
}

// BinomialAtLeast is P(X >= hits), as BinomialAtMost.
func BinomialAtLeast(hits, n int, p float64) (float64, error) {
	if err := checkTrials(hits, n, p); err != nil {
		return 0, err
	}
	return lowerTail(n-hits, n, 1-p, p), nil
}

// lowerTail sums the tail that falls away from the mean, so that no digit is lost: the lower one at most at the mean, and else one
// less the upper.
func lowerTail(hits, n int, p, q float64) float64 {
	if float64(hits) > float64(n)*p {
		if hits == n {
			return 1
		}
		return 1 - falling(n-hits-1, n, q, p)
	}
	return max(falling(hits, n, p, q), SmallestTail)
}

// falling is P(X <= hits) for hits about the mean or below: P(X = k-1) = P(X = k) k q/((n-k+1) p).
func falling(hits, n int, p, q float64) float64 {
	sum, term := 1.0, 1.0
	for k := float64(hits); k > 0 && term > 1e-17*sum; k-- {
		term *= k * q / ((float64(n) - k + 1) * p)
		sum += term
	}
	return point(float64(hits), float64(n), p, q) * sum
}

// point is P(X = x) by the saddle-point form of Loader (2000, Fast and Accurate Computation of Binomial Probabilities), in which
// nothing cancels.
func point(x, n, p, q float64) float64 {
	switch x {
	case 0:
		return math.Exp(n * math.Log1p(-p))
	case n:
		return math.Exp(n * math.Log1p(-q))
	}
	ln := stirlingRest(n) - stirlingRest(x) - stirlingRest(n-x) - deviance(x, n*p) - deviance(n-x, n*q)
	return math.Exp(ln) * math.Sqrt(n/(2*math.Pi*x*(n-x)))
}

// stirlingRest is ln n! less Stirling's sqrt(2 pi n) (n/e)^n, for whole n from 1. Abramowitz and Stegun 6.1.41.
func stirlingRest(n float64) float64 {
	if n < 16 {
		factorial := 1.0
		for k := 2.0; k <= n; k++ {
			factorial *= k
		}
		return math.Log(factorial/math.Sqrt(2*math.Pi*n)) - n*math.Log(n) + n
	}
	inverse := 1 / (n * n)
	return (1.0/12 - inverse*(1.0/360-inverse*(1.0/1260-inverse*(1.0/1680-inverse/1188)))) / n
}

// deviance is x ln(x/m) + m - x for x, m >= 0, with 0 ln 0 = 0 (Loader 2000, bd0): by the series in v = (x-m)/(x+m) where both are
// close, so that nothing cancels.
//
//	(x-m) v + 2 x (v^3/3 + v^5/5 + ...)
func deviance(x, m float64) float64 {
	switch {
	case x == m:
		return 0
	case x == 0:
		return m
	case math.Abs(x-m) > 0.1*(x+m):
		return x*math.Log(x/m) + m - x
	}
	v := (x - m) / (x + m)
	sum, power := (x-m)*v, 2*x*v
	for k := 3.0; ; k += 2 {
		power *= v * v
		next := sum + power/k
		if next == sum {
			return sum
		}
		sum = next
	}
}
