package stats

import "math/big"

// Autocorrelation is the correlation of a series of values with itself one step later, correctly rounded:
//
//	r = sum((k[i]-m) (k[i+1]-m)) / sum((k[i]-m)^2),  m the mean of all
//
// as NIST's Statistical Reference Datasets define it. Numerator and denominator are taken as whole numbers, times n^2:
//
//	n^2 sum(k[i] k[i+1]) - n S (2S - first - last) + (n-1) S^2,  n (n sum(k^2) - S^2)
//
// ok is false below two values or when all are equal.
func Autocorrelation(values []int64) (r float64, ok bool) {
	s := new(bigSums)
	for i, k := range values {
		s.add(k, values[max(i-1, 0)], i > 0)
	}
	n := big.NewInt(int64(len(values)))
	below := s.spread(n)
	if len(values) < 2 || below.Sign() == 0 {
		return 0, false
	}
	ends := new(big.Int).Add(big.NewInt(values[0]), big.NewInt(values[len(values)-1]))
	twice := new(big.Int).Lsh(&s.sum, 1)
	above := new(big.Int).Mul(n, &s.lagged)
	above.Sub(above, twice.Mul(&s.sum, twice.Sub(twice, ends))).Mul(above, n)
	square := new(big.Int).Mul(&s.sum, &s.sum)
	above.Add(above, square.Mul(square, big.NewInt(int64(len(values)-1))))
	r, _ = new(big.Rat).SetFrac(above, below.Mul(below, n)).Float64()
	return r, true
}

// bigSums are the sums of k, k^2 and k times the value before it.
type bigSums struct{ sum, squares, lagged big.Int }

func (s *bigSums) add(k, before int64, follows bool) {
	b := big.NewInt(k)
	s.sum.Add(&s.sum, b)
	if follows {
		s.lagged.Add(&s.lagged, new(big.Int).Mul(b, big.NewInt(before)))
	}
	s.squares.Add(&s.squares, b.Mul(b, b))
}

func (s *bigSums) spread(n *big.Int) *big.Int {
	d := new(big.Int).Mul(n, &s.squares)
	return d.Sub(d, new(big.Int).Mul(&s.sum, &s.sum))
}
