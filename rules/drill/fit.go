package drill

import (
	"math"
	"slices"

	"strayd/rules"
)

func roundHalfAway(v float64) float64 { return math.Round(v) }

// Fit is the straight line of a series on what it is held against, by least squares over the whole book:
//
//	return = Alpha + Beta x reference + residual
//
// It is for choosing and scoring plants and uses the future too: nothing judges by it.
type Fit struct {
	Alpha, Beta, Deviation float64 // Deviation of the residual, divisor n-2
	OK                     bool
}

// Fits are the fits of a book's series, with the reference returns behind them.
type Fits struct {
	Of   []Fit
	book *Book
	mid  map[string][]float64 // median of a group by date, NaN without three values
}

// NewFits fits every series that has a reference.
func NewFits(b *Book) *Fits {
	f := &Fits{Of: make([]Fit, len(b.Series)), book: b, mid: map[string][]float64{}}
	for s := range b.Series {
		f.Of[s] = f.line(s)
	}
	return f
}

// reference is what a series is held against on a date: its benchmark, or the median of its whole group.
func (f *Fits) reference(t, s int) (float64, bool) {
	of := &f.book.Series[s]
	switch {
	case of.Reference >= 0:
		u := f.book.Values[t][of.Reference]
		return u.Float(), u != rules.Missing
	case of.Peers:
		m := f.medians(of.Group)[t]
		return m, !math.IsNaN(m)
	}
	return 0, false
}

func (f *Fits) medians(group string) []float64 {
	if m, ok := f.mid[group]; ok {
		return m
	}
	m := make([]float64, len(f.book.Dates))
	for t, row := range f.book.Values {
		var at []float64
		for s, u := range row {
			if f.book.Series[s].Group == group && !f.book.Series[s].Helper && u != rules.Missing {
				at = append(at, u.Float())
			}
		}
		m[t] = math.NaN()
		if len(at) >= 3 {
			slices.Sort(at)
			m[t] = at[len(at)/2]
		}
	}
	f.mid[group] = m
	return m
}

func (f *Fits) line(s int) Fit {
	var n, sx, sy, sxx, sxy, syy float64
	for t, row := range f.book.Values {
		x, ok := f.reference(t, s)
		if !ok || row[s] == rules.Missing {
			continue
		}
		y := row[s].Float()
		n, sx, sy, sxx, sxy, syy = n+1, sx+x, sy+y, sxx+x*x, sxy+x*y, syy+y*y
	}
	vx, vxy, vy := sxx-sx*sx/n, sxy-sx*sy/n, syy-sy*sy/n
	if n < 20 || vx <= 0 {
		return Fit{}
	}
	beta := vxy / vx
	left := max(vy-beta*vxy, 0)
	return Fit{Alpha: (sy - beta*sx) / n, Beta: beta, Deviation: math.Sqrt(left / (n - 2)), OK: left > 0}
}

// Left is how many residual deviations a value leaves between itself and what the reference foresees; 0 without a fit.
func (f *Fits) Left(t, s int, value rules.Units) float64 {
	x, ok := f.reference(t, s)
	if fit := f.Of[s]; ok && fit.OK {
		return math.Abs(value.Float()-fit.Alpha-fit.Beta*x) / fit.Deviation
	}
	return 0
}

// deviation is the deviation of a series over the 60 observations before a date; ok is false with fewer than 20.
func (b *Book) deviation(t, s int) (float64, bool) {
	var n, sum, sq float64
	for i := t - 1; i >= 0 && n < 60; i-- {
		if u := b.Values[i][s]; u != rules.Missing {
			r := u.Float()
			n, sum, sq = n+1, sum+r, sq+r*r
		}
	}
	if n < 20 {
		return 0, false
	}
	v := (sq - sum*sum/n) / (n - 1)
	return math.Sqrt(max(v, 0)), v > 0
}
