package causes

import "strayd/rules"

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
	p.add(w, rules.CauseFXMissing, priorFX, lk.width()*by*lk.fits(y), rules.Some(y))
	y = (1+lk.x)/by - 1
	p.add(w, rules.CauseFXTwice, priorFX, lk.width()/by*lk.fits(y), rules.Some(y))
}

// since is how often a return that is not of one day goes on from the value before, and how often it is that of the month so far.
var since = [2]float64{0.98, 0.02}

// runs weighs causes that last for days: a return since the start of something instead of since yesterday, and a value of the date before.
func (p *Pool) runs(w *weighing, lk *look, st *state) {
	like, best, implied := 0.0, 0.0, 0.0
	for k, base := range [2]float64{1 + st.printed.Float(), st.sofar} {
		if base > 0.2 && base != 1 && st.printed != rules.Missing {
			y := (1+lk.x)/base - 1
			l := float64(since[k] * lk.width() / base * lk.fits(y))
			if l > best {
				best, implied = l, y
			}
			like += l
		}
	}
	p.add(w, rules.CauseCumulative, priorCumulative, like, rules.Some(implied))
	if lk.hasRef && lk.m1 == lk.m1 {
		mu := st.fit.at(lk.m1, st.ref[(p.t-2)&mask])
		p.add(w, rules.CauseShifted, priorShifted, lk.width()*usual.at((lk.x-mu)/lk.s)/lk.s, rules.Num{})
	}
}
