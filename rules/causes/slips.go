package causes

import (
	"math"

	"strayd/rules"
)

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
func (p *Pool) scales(w *weighing, lk *look, st *state) {
	b := p.bell(w.member)
	for _, f := range factors {
		k := float64(f.by)
		y := lk.x / k
		like := (1 - rounded) * lk.width() / k
		if int(lk.places)+f.digits <= lk.digits {
			like += rounded * lk.tick
		}
		p.add(w, f.cause, f.prior, like*b.at((y-lk.mu)/lk.s)/lk.s, rules.Some(y))
	}
	y := lk.x * 100
	p.add(w, rules.CauseDiv100, priorDiv100, p.hundredth(w.member, lk, y), rules.Some(y))
	p.add(w, rules.CauseSign, priorSign, lk.width()*b.at((-lk.x-lk.mu)/lk.s)/lk.s, rules.Some(-lk.x))
}

// hundredth is the probability of a printed value y/100: re-rounded to the series' decimals, or with two decimals more.
func (p *Pool) hundredth(i int, lk *look, y float64) float64 {
	b := p.bell(i)
	like := 0.0
	if !lk.finer {
		like = 0.5 * b.cell(y, 100*lk.tick, lk.mu, lk.s)
	}
	if int(lk.places) <= lk.digits+2 {
		like += 0.5 * lk.tick * b.at((y-lk.mu)/lk.s) / lk.s
	}
	return like
}

// again weighs yesterday's value sent again, and a zero for a missing value.
func (p *Pool) again(w *weighing, lk *look, st *state) {
	switch {
	case lk.u == 0:
		p.add(w, rules.CauseZero, priorZero, 1, rules.Num{})
	case lk.mark&markRepeat != 0:
		p.add(w, rules.CauseRepeat, priorRepeat, 1, rules.Num{})
	}
}

// splits are the usual ratios of new units to old ones, and the inverse for a consolidation.
var splits = []float64{2, 3, 4, 5, 10, 1.5, 20, 0.5, 1.0 / 3, 0.25, 0.2, 0.1, 0.05}

// Sizes of distributions, as a share of the net asset value: a lognormal with this median and deviation of its logarithm; a judgement, no
// source.
const (
	middlePayout = 0.007
	payoutSpread = 0.7
)

// payouts weighs distributions and splits that the return leaves out, or counts twice.
func (p *Pool) payouts(w *weighing, lk *look, i int) {
	for _, e := range p.near(i) {
		share := 1.0
		if e.Date != p.date {
			share = offByOne
		}
		p.listed(w, lk, e, share)
	}
	p.unlisted(w, lk)
}

func (p *Pool) listed(w *weighing, lk *look, e rules.Event, share float64) {
	switch {
	case e.Kind == "split" && e.Amount > 0:
		p.split(w, lk, e.Amount, share*listedSplit)
	case e.Kind == "distribution":
		y := lk.x + e.Amount
		p.add(w, rules.CauseMissed, share*listedMissed, lk.width()*p.fits(w.member, lk, y), rules.Some(y))
		y = lk.x - e.Amount
		p.add(w, rules.CauseDoubled, share*listedDoubled, lk.width()*p.fits(w.member, lk, y), rules.Some(y))
	}
}

func (p *Pool) split(w *weighing, lk *look, k, prior float64) {
	y := float64((1+lk.x)*k) - 1
	p.add(w, rules.CauseSplit, prior, lk.width()*k*p.fits(w.member, lk, y), rules.Some(y))
}

// unlisted weighs a distribution of unknown size: what is left unexplained is its size.
func (p *Pool) unlisted(w *weighing, lk *look) {
	d := lk.mu - lk.x
	if size := math.Abs(d); size > 2*lk.s {
		y := math.Log(size/middlePayout) / payoutSpread
		like := lk.width() * math.Exp(-y*y/2) / (size * payoutSpread * math.Sqrt(2*math.Pi))
		if d > 0 {
			p.add(w, rules.CauseMissed, priorMissed, like, rules.Some(lk.mu))
		} else {
			p.add(w, rules.CauseDoubled, priorDoubled, like, rules.Some(lk.mu))
		}
	}
	if math.Abs(lk.x) > 0.2 {
		for _, k := range splits {
			p.split(w, lk, k, priorSplit)
		}
	}
}

// eventDays is how many days a business day may span: a Friday before a Monday.
const eventDays = 3

// near lists a member's events of today or a business day beside it.
func (p *Pool) near(i int) []rules.Event {
	e, from := p.members[i].Events, p.states[i].event
	for from < len(e) && rules.Weekdays(e[from].Date, p.date) > 1 {
		from++
	}
	to := from
	for to < len(e) && (e[to].Date <= p.date || rules.Weekdays(p.date, e[to].Date) <= 1) {
		to++
	}
	return e[from:to]
}

// currency weighs a currency's return that was left out or applied twice: base = (1 + local)(1 + fx) - 1.
func (p *Pool) currency(w *weighing, lk *look, i int) {
	fx := p.members[i].FX
	if fx < 0 || !(p.looks[fx].x == p.looks[fx].x) || p.states[fx].isOut {
		return
	}
	by := 1 + p.looks[fx].x
	if by <= 0 {
		return
	}
	y := float64((1+lk.x)*by) - 1
	p.add(w, rules.CauseFXMissing, priorFX, lk.width()*by*p.fits(i, lk, y), rules.Some(y))
	y = (1+lk.x)/by - 1
	p.add(w, rules.CauseFXTwice, priorFX, lk.width()/by*p.fits(i, lk, y), rules.Some(y))
}

// since is how often a return that is not of one day goes on from the value before, and how often it is that of the month so far.
var since = [2]float64{0.98, 0.02}

// runs weighs causes that last for days: a return since the start of something instead of since yesterday, and a value of the date before.
func (p *Pool) runs(w *weighing, lk *look, st *state) {
	i := w.member
	like, best, implied := 0.0, 0.0, 0.0
	for k, base := range [2]float64{1 + st.printed.Float(), st.sofar} {
		if base > 0.2 && base != 1 && st.printed != rules.Missing {
			y := (1+lk.x)/base - 1
			l := since[k] * lk.width() / base * p.fits(i, lk, y)
			if l > best {
				best, implied = l, y
			}
			like += l
		}
	}
	p.add(w, rules.CauseCumulative, priorCumulative, like, rules.Some(implied))
	if lk.hasRef && lk.m1 == lk.m1 {
		mu := st.fit.at(lk.m1, st.ref[(p.t-2)&mask])
		p.add(w, rules.CauseShifted, priorShifted, lk.width()*p.bell(i).at((lk.x-mu)/lk.s)/lk.s, rules.Num{})
	}
}
