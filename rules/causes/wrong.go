package causes

import (
	"cmp"
	"math"
	"slices"

	"strayd/rules"
)

// A reference is wrong when its followers agree on another return for it.
const (
	leastFollowers = 3
	priorWrong     = 3e-4
	mostWrong      = 3 // dates of the last ten: after so many it is the relation that has changed, and the reference counts again
	flat           = 1e-3
)

// implied is what a follower says its reference must have been, with its deviation.
type implied struct{ m, dev float64 }

// contradiction is what the followers of a benchmark say against it.
type contradiction struct {
	benchmark, followers int
	at                   int     // of the benchmark among them
	agreed               float64 // the return they agree on
	wrong                float64 // log odds that the benchmark is wrong
	late                 float64 // log odds, before any prior, that their values are those of the date before
	early                float64 // that those of yesterday belong to today
	again, anew          int     // whose value is yesterday's again, and who had a value yesterday
	pro, contra          int     // followers that fit yesterday's return clearly better, and clearly worse
}

// contradictions finds the references that do not fit, and files that are a day off. The followers are then held against their own past.
func (p *Pool) contradictions(r *Result) {
	p.contra = p.contra[:0]
	for k, b := range p.benchmarks {
		if x := p.looks[b].x; x != x {
			continue
		}
		said := p.said(b)
		if len(said) < leastFollowers {
			continue
		}
		c := contradiction{benchmark: b, at: k, followers: len(said)}
		a := &p.alike[k]
		a.today = p.inCommon(b)
		c.agreed, c.wrong = p.disagreement(said, p.looks[b].x, a)
		p.offDates(&c, a.weight(len(said)))
		p.contra = append(p.contra, c)
	}
	if p.shifted() {
		p.setAside(r)
		return
	}
	for _, c := range p.contra {
		if c.wrong > 0 && p.states[c.benchmark].lately < mostWrong {
			p.wrong(c, r)
		}
	}
}

func (p *Pool) wrong(c contradiction, r *Result) {
	st := &p.states[c.benchmark]
	st.isOut, st.isWrong = true, true
	p.alike[c.at].today = math.NaN()
	r.Wrong = append(r.Wrong, WrongSeries{Member: c.benchmark, Followers: c.followers, Implied: rules.Some(c.agreed)})
	for _, i := range p.followers[c.benchmark] {
		p.alone(i)
	}
}

// said lists what the followers of a reference imply, ascending.
func (p *Pool) said(b int) []implied {
	said := p.says[:0]
	for _, i := range p.followers[b] {
		if v, ok := p.say(i); ok {
			said = append(said, v)
		}
	}
	p.says = said
	slices.SortFunc(said, byImplied)
	return said
}

func byImplied(a, b implied) int { return cmp.Or(cmp.Compare(a.m, b.m), cmp.Compare(a.dev, b.dev)) }

func (p *Pool) say(i int) (v implied, ok bool) {
	lk, f := &p.looks[i], &p.states[i].fit
	if !lk.hasRef || !lk.judged || f.slope < 0.2 {
		return v, false
	}
	return implied{lk.m + float64((lk.x-lk.mu)/f.slope), lk.s / f.slope}, true
}

// disagreement is the return that followers agree on, their weighted median, and the logarithm of the odds that the reference is wrong.
func (p *Pool) disagreement(said []implied, m float64, a *alike) (agreed, odds float64) {
	agreed = weightedMedian(said)
	gains, agree := 0.0, 0
	for _, v := range said {
		gain := better((v.m-agreed)/v.dev, (v.m-m)/v.dev)
		gains += gain
		if gain > 1 {
			agree++
		}
	}
	if 2*agree < len(said) || agree < leastFollowers || a.usual(len(said)) {
		return agreed, math.Inf(-1)
	}
	return agreed, math.Log(priorWrong) + float64(a.weight(len(said))*gains)
}

// better is the logarithm of how much likelier one distance is than another, in deviations. A follower may be wrong itself: a small share of a
// flat density keeps it from saying more than e^6.5, and anything where both are far.
func better(z, than float64) float64 {
	return math.Log((usual.at(z) + flat) / (usual.at(than) + flat))
}

// weightedMedian weighs by the inverse of the variance.
func weightedMedian(said []implied) float64 {
	total := 0.0
	for _, v := range said {
		total += 1 / float64(v.dev*v.dev)
	}
	sum := 0.0
	for _, v := range said {
		if sum += 1 / float64(v.dev*v.dev); 2*sum >= total {
			return v.m
		}
	}
	return said[len(said)-1].m
}

// alone holds a follower of a wrong reference against nothing but its own past.
func (p *Pool) alone(i int) {
	if lk := &p.looks[i]; lk.x == lk.x {
		lk.m = math.NaN()
		p.prepare(i)
	}
}
