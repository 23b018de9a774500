package causes

import (
	"math"

	"strayd/stats"
)

// bell is Student's t scaled to unit variance, as density and as probability of a cell.
type bell struct {
	tail  stats.Tail
	peak  float64
	inner float64 // df - 2
	power int     // df + 1
}

// The tails of ordinary values and of what happens. Values that follow their clusters of volatility have about five degrees of freedom.
var (
	usual = bellOf(5)
	heavy = bellOf(3)
)

func bellOf(df int) *bell {
	tail, err := stats.ScaledT(float64(df))
	if err != nil {
		panic(err) // both are above 2
	}
	return &bell{tail, tail.Density(0), float64(df - 2), df + 1}
}

// at is the density at z:
//
//	peak (1 + z^2/(df-2))^(-(df+1)/2)
func (b *bell) at(z float64) float64 {
	base, d := 1+z*z/b.inner, b.peak
	n := b.power
	for ; n >= 2; n -= 2 {
		d /= base
	}
	if n == 1 {
		d /= math.Sqrt(base)
	}
	return d
}

// cell is the probability of the cell of a width around x, under a centre and a deviation. A narrow cell is its middle's density times its
// width; the error is below (width/deviation)^2/24 x |f"/f|, a hundredth where they meet.
func (b *bell) cell(x, width, centre, deviation float64) float64 {
	z, w := (x-centre)/deviation, width/deviation
	if w < 0.4 {
		return b.at(z) * w
	}
	low, _ := b.tail.Upper(math.Abs(z) - w/2)
	high, _ := b.tail.Upper(math.Abs(z) + w/2)
	return max(low-high, 0)
}
