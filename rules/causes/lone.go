package causes

import (
	"math"
	"slices"

	"strayd/rules"
)

// Lone weighs values of series that have no group, reference, currency or event, one at a time, on nothing but the series' own past: there
// can be millions of them, and they need no pool. What it can tell is little: a zero or a repeat where the decimals are fine, a slipped
// point, a split, a spike that is taken back. Doubt begins at even odds. One goroutine at a time may use a Lone.
type Lone struct {
	pool         *Pool
	size, sorted []float64 // room
}

// NewLone makes a Lone. It is about 20 KB: make one for each worker.
func NewLone() *Lone {
	return &Lone{pool: NewPool([]Member{{Group: -1, FX: -1}}, nil, 0)}
}

// Calls says whether a value needs Weigh at all: one that is neither zero nor the value before again, and inside its watch line, does not.
// before is the printed value of the date before, inside what the range says.
func Calls(u, before rules.Units, inside bool) bool { return u == 0 || u == before || !inside }

// Weigh says what a printed value of a date looks like, given the values before it: past is by date, oldest first, without the value
// itself, rules.Missing where there is none, in the form in which windows take them (left-out values are missing); the last span dates
// count. before is the printed value of the date before. earlier is set where the value takes back a spike of the date before: then the
// flag of that date looks like one, and this value asks for none.
func (l *Lone) Weigh(past []rules.Units, before rules.Units, date rules.Date, u rules.Units) (v View, earlier bool) {
	p := l.pool
	p.date, p.slow = date, p.slow[:0]
	lk, st := &p.looks[0], &p.states[0]
	if !l.look(past, before, u) {
		return View{Date: date}, false
	}
	odds := l.reversal(before)
	l.carry(l.run(past, u))
	w := p.weigh(0)
	v = p.view(0, lk)
	v.LogOdds = w.logOdds()
	odds /= w.total()
	if odds > 1 {
		lk.reversal = odds
	} else if best := w.best(); best >= 0 && v.LogOdds > 0 && w.odds[best].ratio > math.E {
		v.Kind = kindOf(w.odds[best].cause, st)
	}
	v.Out = v.LogOdds > 0 || odds > 1
	if v.Out {
		v.Use = Out
	}
	if v.Kind != "" || v.Out || math.Abs(lk.z) > watchZ {
		p.shares(w, lk, &v)
	}
	return v, odds > 1
}

// look lays out a value and what its past says. ok is false where the past is too short.
func (l *Lone) look(past []rules.Units, before, u rules.Units) (ok bool) {
	p := l.pool
	lk, st := &p.looks[0], &p.states[0]
	st.zeros, st.repeats, st.seen, st.unchanged = coincidence{}, coincidence{}, 0, 0
	st.grid = newGrid()
	l.past(past, st)
	*lk = look{u: u, x: u.Float(), places: decimals(u), m: math.NaN(), m1: math.NaN(), judged: true}
	st.printed, st.lastPrinted, st.lastAt = before, before, p.t
	mean, variance, n := l.variance(past)
	if n < leastSeen {
		return false
	}
	p.marks(lk, st)
	lk.own = max(math.Sqrt(variance*(1+1/float64(n))), leastDeviation, 0.29*lk.tick)
	lk.mean, lk.mu, lk.s = mean, mean, lk.own
	lk.z = (lk.x - lk.mu) / lk.s
	lk.ownZ = lk.z
	return true
}

// past counts zeros, repeats and decimals.
func (l *Lone) past(past []rules.Units, st *state) {
	last, again := rules.Missing, false
	for k, u := range past[max(0, len(past)-span):] {
		if u == rules.Missing {
			continue
		}
		st.seen++
		switch {
		case u == 0:
			st.zeros.count(true, last != 0, 1)
		case u == last:
			st.repeats.count(true, !again, 1)
		}
		again, last = u == last, u
		if k >= min(len(past), span)-guard {
			st.grid.count[decimals(u)]++
			st.grid.n++
		}
	}
}

// variance gives mean and variance as a scale does that has taken the values one by one, with bounds by the newest guard values.
func (l *Lone) variance(past []rules.Units) (mean, v float64, n int) {
	size := l.size[:0]
	for k := len(past) - 1; k >= 0 && len(size) < long; k-- {
		if u := past[k]; u != rules.Missing {
			size = append(size, u.Float())
		}
	}
	l.size = size
	n = len(size)
	l.sorted = l.sorted[:0]
	for _, x := range size[:min(n, guard)] {
		l.sorted = append(l.sorted, math.Abs(x))
	}
	slices.Sort(l.sorted)
	bound := boundOf(l.sorted)
	var s scale
	for k, x := range size {
		if bound > 0 {
			x = min(max(x, -bound), bound)
		}
		c := int64(math.RoundToEven(min(max(x, -1), 1) * fine))
		for b, most := range boxes {
			if k < most {
				s.n[b]++
				s.total[b] += c
				s.square[b] += c * c
			}
		}
	}
	mean = s.mean()
	return mean, s.variance(mean, 0), n
}

// run is how many of the newest values are zeros, or all equal, like u.
func (l *Lone) run(past []rules.Units, u rules.Units) (n int) {
	for k := len(past) - 1; k >= 0 && n < depth && past[k] == u; k-- {
		n++
	}
	return n
}

// carry sets what a run of n zeros or repeats carries into today, each with today's evidence.
func (l *Lone) carry(n int) {
	p := l.pool
	lk, st := &p.looks[0], &p.states[0]
	st.chain = chain{partner: -1}
	k := runRepeat
	if lk.u == 0 {
		k = runZero
	} else {
		n-- // the first of equal values repeats nothing
	}
	st.unchanged = max(n, 0)
	ratio, post := 1/p.ordinary(0), 0.0
	for range n {
		post = ratio * (startPrior[k] + float64(stays[k]*post))
		post /= 1 + post
	}
	st.chain.carry[k] = stays[k] * post
}

// reversal is the weight of today taking back a spike of the date before.
func (l *Lone) reversal(before rules.Units) float64 {
	p := l.pool
	if before == rules.Missing {
		return 0
	}
	today := p.looks[0]
	a := today
	a.u, a.x, a.places, a.mark = before, before.Float(), decimals(before), markSeen
	a.z = (a.x - a.mu) / a.s
	a.ownZ, a.finer = a.z, int(a.places) > a.digits
	if math.Abs(a.z) < 4 || math.Abs(today.z) < 2 {
		return 0
	}
	p.looks[0] = a
	a.total = p.weigh(0).total()
	p.looks[0] = today
	return p.spike(0, &a, &today)
}
