package drill

import (
	"math"

	"strayd/rules"
)

// Market moves a whole group on a date: what it is held against returns as many deviations of the 60 dates before as are given, and every
// fund with it by its slope. Three of the group do not take part: one stands still, one has lost its sign, one is off by 10 residual
// deviations of its own. It gives the changed book and those three; nil where the group has no fit.
func (b *Book) Market(f *Fits, at int, group string, deviations float64) (*Book, []int) {
	out := b.Clone()
	var odd []int
	for s := range b.Series {
		of := &b.Series[s]
		fit := f.Of[s]
		from, ok := f.reference(at, s)
		if of.Group != group || of.Helper || !fit.OK || !ok {
			continue
		}
		to := deviations * f.spread(at, s)
		if of.Reference >= 0 {
			out.Values[at][of.Reference], _ = b.Series[of.Reference].print(to)
		}
		r := b.Values[at][s].Float() + fit.Beta*(to-from)
		switch len(odd) {
		case 0:
			r = 0
		case 1:
			r = -r
		case 2:
			r -= 10 * fit.Deviation
		}
		if len(odd) < 3 {
			odd = append(odd, s)
		}
		out.Values[at][s], _ = of.print(r)
	}
	if odd == nil {
		return nil, nil
	}
	return out, odd
}

// spread is the deviation of what a series is held against, over the 60 dates before one, about zero.
func (f *Fits) spread(at, s int) float64 {
	n, sum := 0, 0.0
	for t := max(0, at-60); t < at; t++ {
		if m, ok := f.reference(t, s); ok {
			n++
			sum += m * m
		}
	}
	return math.Sqrt(sum / float64(max(n, 1)))
}

// Louder doubles every return from a date on.
func (b *Book) Louder(from int) *Book {
	out := b.Clone()
	for _, row := range out.Values[from:] {
		for s := range row {
			if row[s] != rules.Missing {
				row[s] *= 2
			}
		}
	}
	return out
}
