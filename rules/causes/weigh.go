package causes

import "strayd/rules"

// Priors: how often a value is wrong in each way, before anything is known of it. They are a judgement from practice, no source: scale and
// sign slips once in some 1,000 to 3,000 values, a value sent again or left at zero once in 300.
const (
	priorX100       = 1e-4
	priorX10000     = 1e-4
	priorX10        = 8.5e-5
	priorDiv100     = 1.5e-3
	priorSign       = 1.4e-3
	priorRepeat     = 1.5e-3
	priorZero       = 1.3e-3
	priorSpike      = 3e-4
	priorMissed     = 1.5e-3 // without a calendar
	priorDoubled    = 3e-5
	priorSplit      = 5e-5
	priorFX         = 3e-4
	priorSwap       = 2e-3
	priorCumulative = 3e-4
	priorShifted    = 5e-5
	listedMissed    = 0.09 // on a listed date
	listedDoubled   = 0.03
	listedSplit     = 0.2
	offByOne        = 0.05 // factor of the above a business day beside it
)

// odd is one way in which a value may not be ordinary.
type odd struct {
	cause   rules.Cause
	weight  float64 // prior x probability of the printed value
	ratio   float64 // probability over that of an ordinary value
	implied rules.Num
	partner int // of a swap
}

// weighing is a value that is not plainly ordinary, with the causes that compete for it.
type weighing struct {
	member   int
	ordinary float64 // weight
	genuine  float64
	odds     []odd
}

// add enters a cause. like is the probability of the printed value under it.
func (p *Pool) add(w *weighing, c rules.Cause, prior, like float64, implied rules.Num) {
	if like <= 0 {
		return
	}
	st := &p.states[w.member]
	ratio := like / w.ordinary
	if k := persistent(c); k >= 0 {
		prior = st.chain.prior(k, prior)
		st.chain.note(k, ratio)
	}
	w.odds = append(w.odds, odd{c, prior * like, ratio, implied, -1})
}

// weigh lists the causes that may lie behind a member's value, but for those that need the other weighings.
func (p *Pool) weigh(i int) *weighing {
	w := p.weighing(i)
	lk, st := &p.looks[i], &p.states[i]
	w.ordinary = p.ordinary(i)
	w.genuine = p.rate(i) * lk.genuine()
	p.scales(w, lk)
	p.again(w, lk)
	p.payouts(w, lk, i)
	p.currency(w, lk, i)
	p.runs(w, lk, st)
	return w
}

// weighing takes an empty one from the pool's store.
func (p *Pool) weighing(i int) *weighing {
	if len(p.slow) < cap(p.slow) {
		p.slow = p.slow[:len(p.slow)+1]
	} else {
		p.slow = append(p.slow, weighing{})
	}
	w := &p.slow[len(p.slow)-1]
	w.member, w.odds = i, w.odds[:0]
	return w
}

// fits is the density of a return where the reference foresees it.
func (lk *look) fits(x float64) float64 {
	return usual.at((x-lk.mu)/lk.s) / lk.s
}

// ordinary is the probability of the printed value on an ordinary day: the cell around it, and the zeros and repeats that the series has
// beyond chance.
func (p *Pool) ordinary(i int) float64 {
	lk, st := &p.looks[i], &p.states[i]
	like := usual.cell(lk.x, lk.width(), lk.mu, lk.s)
	switch {
	case lk.mark&markZero != 0:
		like += natural(st.zeros, lk.mark&markAgain != 0, st.seen, 0.49*lk.tick/lk.own)
	case lk.mark&markRepeat != 0:
		like += natural(st.repeats, lk.mark&markAgain != 0, st.seen, 0.32*lk.tick/lk.own)
	}
	return max(like, 1e-300)
}

// genuine is the probability of the printed value if something happened: half as wide moves of the series' own size, half of its residual.
func (lk *look) genuine() float64 {
	wide, near := 6*lk.own, 4*lk.s
	return lk.width() * (heavy.at((lk.x-lk.mu)/wide)/wide + heavy.at((lk.x-lk.mu)/near)/near) / 2
}
