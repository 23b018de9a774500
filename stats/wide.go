package stats

import (
	"math"
	"math/bits"
)

// Int128 is a signed integer in two's complement.
type Int128 struct {
	Hi int64
	Lo uint64
}

// Uint128 is an unsigned integer.
type Uint128 struct{ Hi, Lo uint64 }

// uint192 is an unsigned integer, the highest word first.
type uint192 [3]uint64

// pair is a number as the unevaluated sum of two floats, the second at most an ulp of the first: about 105 bits.
type pair struct{ hi, lo float64 }

func (a Int128) add(k int64) Int128 {
	lo, c := bits.Add64(a.Lo, uint64(k), 0)
	return Int128{a.Hi + k>>63 + int64(c), lo}
}

func (a Int128) sub(b Int128) Int128 {
	lo, c := bits.Sub64(a.Lo, b.Lo, 0)
	return Int128{a.Hi - b.Hi - int64(c), lo}
}

func (a Int128) abs() Uint128 {
	if a.Hi >= 0 {
		return Uint128{uint64(a.Hi), a.Lo}
	}
	n := Int128{}.sub(a)
	return Uint128{uint64(n.Hi), n.Lo}
}

func (a Uint128) add(b Uint128) Uint128 {
	lo, c := bits.Add64(a.Lo, b.Lo, 0)
	return Uint128{a.Hi + b.Hi + c, lo}
}

func (a Uint128) sub(b Uint128) Uint128 {
	lo, c := bits.Sub64(a.Lo, b.Lo, 0)
	return Uint128{a.Hi - b.Hi - c, lo}
}

// product is a times b.
func product(a, b int64) Int128 {
	hi, lo := bits.Mul64(uint64(a), uint64(b))
	return Int128{int64(hi) - a>>63&b - b>>63&a, lo}
}

func square(k int64) Uint128 { return product(k, k).abs() }

// times is a n, which must stay below 2^192.
func (a Uint128) times(n uint64) uint192 {
	h1, w0 := bits.Mul64(a.Lo, n)
	h2, l2 := bits.Mul64(a.Hi, n)
	w1, c := bits.Add64(h1, l2, 0)
	return uint192{h2 + c, w1, w0}
}

// square is a^2 for a below 2^96: a = h 2^64 + l gives h^2 2^128 + 2 h l 2^64 + l^2.
func (a Uint128) square() uint192 {
	w1, w0 := bits.Mul64(a.Lo, a.Lo)
	crossHi, crossLo := bits.Mul64(2*a.Hi, a.Lo)
	w1, c := bits.Add64(w1, crossLo, 0)
	return uint192{a.Hi*a.Hi + crossHi + c, w1, w0}
}

func (a uint192) sub(b uint192) uint192 {
	w0, c := bits.Sub64(a[2], b[2], 0)
	w1, c := bits.Sub64(a[1], b[1], c)
	w2, _ := bits.Sub64(a[0], b[0], c)
	return uint192{w2, w1, w0}
}

func (a uint192) zero() bool { return a[0]|a[1]|a[2] == 0 }

// pair is a with a relative error below 2^-104: the highest 53 bits exactly, and the rest rounded once.
func (a uint192) pair() pair {
	if a.zero() {
		return pair{}
	}
	exp := 128
	for a[0] == 0 {
		a, exp = uint192{a[1], a[2], 0}, exp-64
	}
	n := bits.LeadingZeros64(a[0])
	top := a[0]<<n | a[1]>>(64-n)
	next := a[1]<<n | a[2]>>(64-n)
	low := float64(top&0x7ff) + float64(float64(next)*0x1p-64)
	return pair{math.Ldexp(float64(top&^0x7ff), exp-n), math.Ldexp(low, exp-n)}
}

func (a Uint128) pair() pair { return uint192{0, a.Hi, a.Lo}.pair() }

func (a Int128) pair() pair {
	p := a.abs().pair()
	if a.Hi < 0 {
		return pair{-p.hi, -p.lo}
	}
	return p
}

// over is a/d: the quotient of the high part, then its exact remainder divided once more.
func (a pair) over(d float64) pair {
	q := (a.hi + a.lo) / d
	rest := math.FMA(-q, d, a.hi) + a.lo
	return pair{q, rest / d}
}

// root is the square root: one Newton step from the root of the high part. Zero stays zero.
func (a pair) root() pair {
	if a.hi == 0 {
		return pair{}
	}
	r := math.Sqrt(a.hi)
	rest := math.FMA(-r, r, a.hi) + a.lo
	return pair{r, rest / (2 * r)}
}

func (a pair) float() float64 { return a.hi + a.lo }
