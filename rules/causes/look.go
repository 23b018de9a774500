package causes

import (
	"math"

	"strayd/rules"
)

// look is one value of today with all that it is held against.
type look struct {
	u         rules.Units
	x         float64 // NaN where there is no value
	places    uint8   // decimals that u is written with
	m, m1     float64 // the reference today and on the date before, NaN where there is none
	hasRef    bool    // the reference takes part in judging
	traces    bool    // there is a residual to remember
	judged    bool
	mu, s     float64 // what is foreseen, and the deviation about it
	mean, own float64 // of the returns themselves: centre and deviation
	z         float64 // (x - mu) / s
	ownZ      float64
	digits    int     // decimals that the series is written with
	tick      float64 // width of the last of them
	finer     bool    // x has more decimals than the series
	rare      float64 // share of ordinary values that have more
	mark      uint8
	total     float64 // weight of all that may explain it, 0 where it was not weighed
	reversal  float64 // odds that it takes back a spike of the date before
	full      bool    // it enters the windows without a bound: somebody decided that it is genuine
	coupled   bool    // it may be exchanged with another series, as yesterday
	elsewhere bool    // it belongs to another date, as those of the whole file
}

// leastSeen is how many values a series has before it is judged on its own; before, a group lends its scale.
const leastSeen = 20

// least deviations that anything is divided by: a tenth of a basis point, and that of rounding to a tick.
const leastDeviation = 1e-5

// prepare works out what today's value of a member is held against.
func (p *Pool) prepare(i int) {
	lk, st := &p.looks[i], &p.states[i]
	lk.hasRef, lk.traces, lk.judged, lk.mark = false, false, false, 0
	if lk.x != lk.x {
		return
	}
	lk.m1 = st.ref[(p.t-1)&mask]
	f := &st.fit
	lk.traces = lk.m == lk.m && f.n >= 5
	lk.hasRef = lk.traces && f.use
	p.marks(lk, st)
	p.foresee(i, lk, st)
	lk.judged = lk.s > 0 && (st.own.n[2] >= leastSeen || p.lends(i))
	lk.z, lk.ownZ = (lk.x-lk.mu)/lk.s, (lk.x-lk.mean)/lk.own
}

func (p *Pool) marks(lk *look, st *state) {
	d, finer := st.grid.places()
	if st.grid.n < 10 {
		d, finer = max(d, int(lk.places)), 0.05
	}
	lk.digits, lk.tick, lk.rare = d, tenth[d], min(finer, 0.05)
	lk.finer = int(lk.places) > d
	lk.mark = markSeen
	latest := st.latest(p.t)
	switch {
	case lk.u == 0:
		lk.mark |= markZero
		if latest == 0 {
			lk.mark |= markAgain
		}
	case lk.u == latest:
		lk.mark |= markRepeat
		if st.unchanged > 0 {
			lk.mark |= markAgain
		}
	}
}

// foresee sets centre and deviation. The deviation holds what the estimates themselves may be off by:
//
//	s^2 = variance (1 + 1/n + (m - mean m)^2 / sum (m - mean m)^2)
func (p *Pool) foresee(i int, lk *look, st *state) {
	f := &st.fit
	lk.mean = st.own.mean()
	ownVar := st.own.variance(lk.mean, p.lent(i, false))
	least := max(leastDeviation, lk.tick*0.29)
	lk.own = max(math.Sqrt(ownVar), least)
	lk.mu, lk.s = lk.mean, lk.own
	if lk.traces {
		lk.mu = f.at(lk.m, lk.m1)
	}
	if !lk.hasRef {
		return
	}
	lent := p.lent(i, true)
	if st.rest.n[2] < leastSeen && f.n >= leastFit {
		lent = ownVar * max(1-f.explains, 0.01)
	}
	v := st.rest.variance(0, lent)
	if v == 0 {
		v = ownVar
	}
	more := 1 / float64(f.n)
	if f.spread > 0 {
		more += float64((lk.m-f.mean)*(lk.m-f.mean)) / f.spread
	}
	lk.s = max(math.Sqrt(v*(1+more)), least)
}

// at is the return that a fit foresees.
func (f *fit) at(m, m1 float64) float64 {
	mu := f.shift + float64(f.slope*m)
	if f.lag != 0 && m1 == m1 {
		mu += float64(f.lag * m1)
	}
	return mu
}

// latest is the newest printed value before date t, unless it is older than ten dates.
func (st *state) latest(t int) rules.Units {
	if t-st.lastAt > 10 {
		return rules.Missing
	}
	return st.lastPrinted
}

// width is the width of the cell that the value is printed in. More decimals than usual are rare by themselves.
func (lk *look) width() float64 {
	if lk.finer {
		return float64(tenth[lk.places] * lk.rare)
	}
	return lk.tick
}
