package causes

import (
	"math"

	"strayd/rules"
)

// A whole file is a day off when the values of all series that are held against benchmarks fit the benchmarks' returns of another date: of
// the date before, or, as shows a day later, of the date after.
const (
	priorShift = 1e-4
	shiftStays = 0.98 // of a shifted file, on the next date
	sentAgain  = 3.0  // what a value that is yesterday's again says for it
	leastEarly = 60   // log odds that the date before fits the benchmark of today: an index file with all its signs lost reaches 50 by chance
	notSent    = -3.0 // what it says against the first day of it that values are there from yesterday and differ
	freeReturn = -3.0 // log of what a return costs that may be anything: deviation of the followers' agreement over that of the benchmark
)

// shift is what is known of a file that is a day off, from yesterday.
type shift struct {
	late, early  bool // it was
	contradicted bool // the benchmarks were
	today        shiftDay
}

type shiftDay struct{ late, early, contradicted bool }

// offDates works out how much better a benchmark's followers fit its return of yesterday, and how much better their values of yesterday fit
// its return of today. weight is what each of them counts for.
func (p *Pool) offDates(c *contradiction, weight float64) {
	m1 := p.states[c.benchmark].yesterday // also where it was thought to be wrong
	if m1 != m1 {
		return
	}
	for _, i := range p.followers[c.benchmark] {
		lk, st := &p.looks[i], &p.states[i]
		if !lk.hasRef || !lk.judged {
			continue
		}
		before := st.fit.at(m1, st.ref[(p.t-2)&mask])
		gain := p.gain(i, lk.x, lk.mu, before)
		c.late += gain
		if p.repeated(i) {
			c.late += lk.saysAgain()
			c.again++
		}
		if st.yesterday == st.yesterday {
			c.anew++
		}
		switch {
		case gain > 1:
			c.pro++
		case gain < -1:
			c.contra++
		}
		if x := st.yesterday; x == x {
			c.early += p.gain(i, x, before, st.fit.at(lk.m, m1))
		}
	}
	c.late, c.early = float64(weight*c.late), float64(weight*c.early)
}

// saysAgain is what a value that is yesterday's again says for a file sent again: no more than chance leaves of it, where few digits or a
// close reference make it likely by itself.
func (lk *look) saysAgain() float64 {
	return min(max(-math.Log(lk.width()*usual.peak/lk.s)-1, 0), sentAgain)
}

// gain is the logarithm of how much better a return fits one centre than another.
func (p *Pool) gain(i int, x, centre, other float64) float64 {
	s := p.looks[i].s
	return better((x-other)/s, (x-centre)/s)
}

// shifted says that the files are a day off, against the rival that each contradicted benchmark is wrong by itself.
func (p *Pool) shifted() bool {
	prior := math.Log(priorShift)
	if p.shift.late || p.shift.early {
		prior = math.Log(shiftStays / (1 - shiftStays))
	}
	var late, rival, free, early float64
	wrong, pro, contra, again, anew := 0, 0, 0, 0, 0
	for _, c := range p.contra {
		late += c.late
		early += c.early
		pro, contra = pro+c.pro, contra+c.contra
		again, anew = again+c.again, anew+c.anew
		if c.wrong > 0 {
			wrong++
			rival += c.wrong + freeReturn
			free += c.wrong + freeReturn - math.Log(priorWrong)
		}
		if c.late > 0 && p.repeated(c.benchmark) { // it is the benchmark that came a day late
			late = math.Inf(-1)
		}
	}
	if !p.shift.late && 2*again < anew {
		late += notSent
	}
	if !p.shift.late && (pro < leastFollowers || pro < 2*contra) {
		late = math.Inf(-1)
	}
	now := &p.shift.today
	now.contradicted = wrong > 0
	now.late = late+prior > max(rival, 0)
	confirmed := p.shift.contradicted && early > leastEarly
	now.early = !now.late && wrong > 0 && (confirmed || p.shift.early) && free+prior > rival
	return now.late || now.early
}

// repeated says that a member's value is yesterday's again, or zero, which is no habit of it.
func (p *Pool) repeated(i int) bool {
	st := &p.states[i]
	switch {
	case p.looks[i].mark&markZero != 0:
		return !usually(st.zeros, st.seen)
	case p.looks[i].mark&markRepeat != 0:
		return !usually(st.repeats, st.seen)
	}
	return false
}

// usually says that more than a tenth of a series' days are so.
func usually(c coincidence, of int) bool { return 10*c.days > of }

// setAside reports the members whose values belong to another date, with all that came by the same feed, and holds them against nothing.
func (p *Pool) setAside(r *Result) {
	feeds := map[string]bool{}
	for _, c := range p.contra {
		p.alike[c.at].today = math.NaN()
		if c.late <= 0 && c.wrong <= 0 {
			continue
		}
		for _, i := range p.followers[c.benchmark] {
			p.looks[i].elsewhere = p.looks[i].judged
			if f := p.members[i].Feed; f != "" {
				feeds[f] = true
			}
		}
	}
	for i := range p.looks {
		lk := &p.looks[i]
		if !lk.judged || !lk.elsewhere && !feeds[p.members[i].Feed] {
			continue
		}
		lk.elsewhere, p.states[i].isOut = true, true
		r.Shifted = append(r.Shifted, i)
		v := p.view(i, lk)
		v.Causes = []rules.Share{{Cause: rules.CauseShifted, Share: 1}}
		v.LooksLike, v.Share, v.Out, v.Use = rules.CauseShifted, 1, true, Out
		r.Views = append(r.Views, v)
	}
}
