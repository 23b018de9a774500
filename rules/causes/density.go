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

// bells are the tails that a group may have, from heavy to light. Degrees of freedom below 3 have no use: the scale itself would be noise.
var bells = [...]bell{bellOf(3), bellOf(4), bellOf(5), bellOf(8)}

// heavy and usual index bells.
const (
	heavy = 0
	usual = 2
)

func bellOf(df int) bell {
	tail, err := stats.ScaledT(float64(df))
	if err != nil {
		panic(err) // the list above holds whole degrees above 2
	}
	return bell{tail, tail.Density(0), float64(df - 2), df + 1}
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
