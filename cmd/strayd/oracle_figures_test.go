package main

import (
	"math"
	"math/big"
	"slices"
	"sync"

	"strayd/rules"
)

// estimate is the centre and the deviation of a window under a range's scale; the deviation is nil where one value has none.
func estimate(r *oracleRange, values []rules.Units) (centre, deviation *big.Float) {
	switch r.scale {
	case "weighted":
		return bigFloat(0), weightedDeviation(values, r.window)
	case "mad":
		return madEstimate(values)
	}
	n := int64(len(values))
	sum, squares := new(big.Int), new(big.Int)
	for _, x := range values {
		k := big.NewInt(int64(x))
		sum.Add(sum, k)
		squares.Add(squares, k.Mul(k, k))
	}
	centre = fraction(new(big.Rat).SetFrac(sum, big.NewInt(n)))
	if n < 2 {
		return centre, nil
	}
	// variance = (sum x^2 - (sum x)^2 / n) / (n - 1)
	square := new(big.Rat).SetFrac(new(big.Int).Mul(sum, sum), big.NewInt(n))
	v := new(big.Rat).Sub(new(big.Rat).SetInt(squares), square)
	v.Quo(v, new(big.Rat).SetInt64(n-1))
	d := new(big.Float).SetPrec(bits).SetRat(v)
	return centre, d.Quo(d.Sqrt(d), bigFloat(1e15))
}

// fraction is a number of units as a return.
func fraction(r *big.Rat) *big.Float {
	f := new(big.Float).SetPrec(bits).SetRat(r)
	return f.Quo(f, bigFloat(1e15))
}

// weightedDeviation: the mean square of the first window values (of those there are, before that), then v = 0.94 v + 0.06 x^2.
func weightedDeviation(values []rules.Units, window int) *big.Float {
	keep, take := new(big.Rat).SetFrac64(94, 100), new(big.Rat).SetFrac64(6, 100)
	decay, rest := new(big.Float).SetPrec(bits).SetRat(keep), new(big.Float).SetPrec(bits).SetRat(take)
	v := bigFloat(0)
	for i, x := range values {
		u := bigUnits(x)
		square := new(big.Float).SetPrec(bits).Mul(u, u)
		switch {
		case i < window:
			v.Add(v, square)
			if i == window-1 {
				v.Quo(v, bigFloat(float64(window)))
			}
		default:
			v.Add(v.Mul(v, decay), square.Mul(square, rest))
		}
	}
	if len(values) < window {
		v.Quo(v, bigFloat(float64(len(values))))
	}
	return v.Sqrt(v)
}

// madEstimate: the median, and 1.4826 times the median distance from it; of an even number the mean of the two middle ones.
func madEstimate(values []rules.Units) (centre, deviation *big.Float) {
	double := make([]*big.Int, len(values)) // twice the values, so that their median is whole
	for i, x := range values {
		double[i] = new(big.Int).Mul(big.NewInt(2), big.NewInt(int64(x)))
	}
	median := middle(double)
	away := make([]*big.Int, len(values))
	for i := range double { // quadruple distances
		d := new(big.Int).Mul(big.NewInt(2), double[i])
		away[i] = d.Abs(d.Sub(d, median))
	}
	mad := middle(away)
	centre = fraction(new(big.Rat).SetFrac(median, big.NewInt(4)))
	deviation = fraction(new(big.Rat).SetFrac(mad, big.NewInt(8)))
	return centre, deviation.Mul(deviation, bigFloat(1.4826))
}

// middle is twice the median.
func middle(values []*big.Int) *big.Int {
	sorted := slices.SortedFunc(slices.Values(values), (*big.Int).Cmp)
	n := len(sorted)
	return new(big.Int).Add(sorted[(n-1)/2], sorted[n/2])
}

// tickDeviation is the finest decimal step that the window shows, over sqrt(12).
func tickDeviation(values []rules.Units) *big.Float {
	step := rules.Units(1)
	for step < 1e17 {
		for _, x := range values {
			if x%(step*10) != 0 {
				root := bigFloat(12)
				return new(big.Float).SetPrec(bits).Quo(bigUnits(step), root.Sqrt(root))
			}
		}
		step *= 10
	}
	return bigFloat(0) // nothing but zeros
}

// oracleTail is the probability of a value at least as far out as z: normal where df is 0, else Student t, scaled to unit variance
// where unit says so. No tail is below the smallest normal float; its logarithm goes on.
func oracleTail(z float64, df int, unit bool, side string) (p, log10 float64) {
	t := z
	if df > 0 && unit {
		t = z * math.Sqrt(float64(df)/float64(df-2))
	}
	var ln float64
	switch side {
	case "lower":
		ln = upperTail(-t, df)
	case "upper":
		ln = upperTail(t, df)
	default:
		ln = math.Ln2 + upperTail(math.Abs(t), df)
	}
	return max(math.Exp(ln), 0x1p-1022), ln / math.Ln10
}

// upperTail is the natural logarithm of P(T > t).
func upperTail(t float64, df int) float64 {
	switch {
	case t < 0:
		return math.Log1p(-math.Exp(upperTail(-t, df)))
	case df == 0 && t < 20:
		return math.Log(math.Erfc(t/math.Sqrt2) / 2)
	case df == 0:
		return farNormal(t)
	case t > 30:
		return farTail(t, float64(df))
	}
	return math.Log(float64Of(finiteSum(t, df)))
}

// farNormal is the normal tail's asymptotic series, Abramowitz and Stegun 26.2.12, up to its smallest term.
func farNormal(t float64) float64 {
	sum, term := 1.0, 1.0
	for k := 1.0; k < 40; k++ {
		term *= -(2*k - 1) / (t * t)
		sum += term
	}
	return -t*t/2 - math.Log(t) - math.Log(2*math.Pi)/2 + math.Log(sum)
}

// finiteSum is the upper tail by Abramowitz and Stegun 26.7.3 and 26.7.4, in big floats, since taking from 1 loses the small ones.
func finiteSum(t float64, df int) *big.Float {
	n := bigFloat(float64(df))
	tt := new(big.Float).SetPrec(bits).Mul(bigFloat(t), bigFloat(t))
	cos2 := new(big.Float).SetPrec(bits).Quo(n, new(big.Float).SetPrec(bits).Add(n, tt))
	sin := new(big.Float).SetPrec(bits).Sub(bigFloat(1), cos2)
	sin.Sqrt(sin)
	sum := bigFloat(0)
	first := 1
	term := bigFloat(1)
	if df%2 == 1 {
		first = 2
		term = new(big.Float).SetPrec(bits).Sqrt(cos2)
	}
	// even: 1 + (1/2) c^2 + (1 3)/(2 4) c^4 + ... ; odd: c + (2/3) c^3 + (2 4)/(3 5) c^5 + ...; the last power is df - 2
	for k := first; k <= df-1; k += 2 {
		sum.Add(sum, term)
		term = new(big.Float).SetPrec(bits).Mul(term, cos2)
		term.Quo(term.Mul(term, bigFloat(float64(k))), bigFloat(float64(k+1)))
	}
	sum.Mul(sum, sin)
	if df%2 == 1 {
		sum.Add(sum, bigAngle(t, df))
		sum.Quo(sum.Mul(sum, bigFloat(2)), bigPi)
	}
	return sum.Quo(sum.Sub(bigFloat(1), sum), bigFloat(2))
}

// bigAngle is arctan(t/sqrt(df)), by halving the angle until its series converges fast.
func bigAngle(t float64, df int) *big.Float {
	root := bigFloat(float64(df))
	x := new(big.Float).SetPrec(bits).Quo(bigFloat(t), root.Sqrt(root))
	halvings := 0
	for ; halvings < 12; halvings++ { // tan(a/2) = tan a / (1 + sqrt(1 + tan^2 a))
		s := new(big.Float).SetPrec(bits).Mul(x, x)
		s.Add(s, bigFloat(1))
		s.Add(s.Sqrt(s), bigFloat(1))
		x.Quo(x, s)
	}
	return scaled(arctanSeries(x), halvings)
}

func arctanSeries(x *big.Float) *big.Float {
	square := new(big.Float).SetPrec(bits).Mul(x, x)
	power, sum := new(big.Float).SetPrec(bits).Set(x), bigFloat(0)
	for k := 0; k < 16; k++ { // x is below 0.0004
		term := new(big.Float).SetPrec(bits).Quo(power, bigFloat(float64(2*k+1)))
		if k%2 == 1 {
			term.Neg(term)
		}
		sum.Add(sum, term)
		power.Mul(power, square)
	}
	return sum
}

func scaled(x *big.Float, doublings int) *big.Float { return x.SetMantExp(x, doublings) }

// bigPi is 4 arctan 1.
var bigPi = scaled(bigAngle(1, 1), 2)

func float64Of(f *big.Float) float64 {
	v, _ := f.Float64()
	return v
}

// farTail is the upper tail of Student's t where t^2 is far above df, its density expanded in w = df/t^2 and integrated term by term:
//
//	gamma((df+1)/2) / (gamma(df/2) sqrt(pi)) df^(df/2) t^-df  sum over k of  c_k / (df + 2k)
//
// with c_0 = 1 and c_(k+1) = -c_k w ((df+1)/2 + k) / (k + 1).
func farTail(t, df float64) float64 {
	a, _ := math.Lgamma((df + 1) / 2)
	b, _ := math.Lgamma(df / 2)
	w := df / (t * t)
	sum, c := 0.0, 1.0
	for k := 0.0; k < 400; k++ {
		sum += c / (df + 2*k)
		c *= -w * ((df+1)/2 + k) / (k + 1)
	}
	return a - b - math.Log(math.Pi)/2 + df/2*math.Log(df) - df*math.Log(t) + math.Log(sum)
}

// lineAt is where a line lies in deviations, found by halving.
func lineAt(l oracleLine, df int, unit bool, side string) float64 {
	if l.z > 0 {
		return l.z
	}
	key := lineKey{l.p, df, unit, side == "both"}
	if z, ok := knownLines.Load(key); ok {
		return z.(float64)
	}
	low, high := 0.0, 1e4
	if side != "both" {
		low = -1e4
		side = "upper"
	}
	for range 200 {
		mid := low + (high-low)/2
		if p, _ := oracleTail(mid, df, unit, side); p > l.p {
			low = mid
		} else {
			high = mid
		}
	}
	knownLines.Store(key, low)
	return low
}

type lineKey struct {
	p    float64
	df   int
	unit bool
	both bool
}

// knownLines spares the search for lines that were found before.
var knownLines sync.Map
