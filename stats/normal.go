package stats

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// normalHalf uses erf and erfc, each where it keeps its digits, and the asymptotic series where erfc ends.
func normalHalf(z float64) half {
	if z < 1 {
		return half{near: true, inner: math.Erf(z/math.Sqrt2) / 2}
	}
	p := math.Erfc(z/math.Sqrt2) / 2
	if p >= SmallestTail {
		return half{p: p, ln: math.Log(p)}
	}
	ln := normalFar(z)
	return half{p: math.Exp(ln), ln: ln}
}

// normalFar is ln P(Z >= z) for z above 30. Abramowitz and Stegun 26.2.12:
//
//	Q(z) = phi(z)/z (1 - 1/z^2 + 1 3/z^4 - 1 3 5/z^6 + ...)
func normalFar(z float64) float64 {
	square := z * z
	sum, term := 1.0, 1.0
	for k := 1.0; math.Abs(term) > 1e-17; k += 2 {
		term *= -k / square
		sum += term
	}
	return -square/2 - math.Log(z) - math.Log(2*math.Pi)/2 + math.Log(sum)
}

// normalQuantile is the z with upper tail p, at most 0.5. Relative error below 1e-15 (the library's is good down to
// SmallestTail on the lower side).
func normalQuantile(p float64) float64 { return -distuv.UnitNormal.Quantile(p) }
