package causes

import (
	"math"

	"strayd/rules"
)

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
		p.add(w, rules.CauseMissed, share*listedMissed, lk.width()*lk.fits(y), rules.Some(y))
		y = lk.x - e.Amount
		p.add(w, rules.CauseDoubled, share*listedDoubled, lk.width()*lk.fits(y), rules.Some(y))
	}
}

func (p *Pool) split(w *weighing, lk *look, k, prior float64) {
	y := float64((1+lk.x)*k) - 1
	p.add(w, rules.CauseSplit, prior, lk.width()*k*lk.fits(y), rules.Some(y))
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

// eventDays is how many days a business day may span: a Thursday before a Tuesday, and longer holidays.
const eventDays = 10

// near lists a member's events of today or a business day beside it.
func (p *Pool) near(i int) []rules.Event {
	e, from := p.members[i].Events, p.states[i].event
	days := p.members[i].Calendar
	for from < len(e) && e[from].Date < p.date && !days.Near(e[from].Date, p.date) {
		from++
	}
	to := from
	for to < len(e) && days.Near(e[to].Date, p.date) {
		to++
	}
	return e[from:to]
}
