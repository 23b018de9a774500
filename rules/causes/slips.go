package causes

import "strayd/rules"

// factors are the slips of the decimal point: the printed value is factor times the true one.
var factors = []struct {
	cause  rules.Cause
	by     int64
	digits int
	prior  float64
}{
	{rules.CauseX100, 100, 2, priorX100},
	{rules.CauseX10000, 10000, 4, priorX10000},
	{rules.CauseX10, 10, 1, priorX10},
}

// rounded is how often a value is slipped after it was rounded to its decimals: a file is read with the wrong unit more often than it is
// written so.
const rounded = 0.9

// scales weighs a slipped point and a lost sign. A value may be multiplied after it was rounded to the series' decimals, and then it lies on
// a coarser grid, or before. The cell of a value y on a grid of width w has the probability of
// the true values that are printed so:
//
//	after:  P(cell of width w around y/k), y a multiple of k w
//	before: P(cell of width w/k around y/k)
func (p *Pool) scales(w *weighing, lk *look) {
	for _, f := range factors {
		k := float64(f.by)
		y := lk.x / k
		like := float64((1 - rounded) * lk.width() / k)
		if int(lk.places)+f.digits <= lk.digits {
			like += float64(rounded * lk.tick)
		}
		p.add(w, f.cause, f.prior, like*lk.fits(y), rules.Some(y))
	}
	y := lk.x * 100
	p.add(w, rules.CauseDiv100, priorDiv100, lk.hundredth(y), rules.Some(y))
	p.add(w, rules.CauseSign, priorSign, lk.width()*lk.fits(-lk.x), rules.Some(-lk.x))
}

// hundredth is the probability of a printed value y/100: re-rounded to the series' decimals, or with two decimals more.
func (lk *look) hundredth(y float64) float64 {
	like := 0.0
	if !lk.finer {
		like = 0.5 * usual.cell(y, 100*lk.tick, lk.mu, lk.s)
	}
	if int(lk.places) <= lk.digits+2 {
		like += float64(0.5 * lk.tick * lk.fits(y))
	}
	return like
}
