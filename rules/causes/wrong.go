package causes

import (
	"math"
	"slices"

	"strayd/rules"
)

// A reference is wrong when its followers agree on another return for it.
const (
	leastFollowers = 3
	priorWrong     = 3e-4
	followerCap    = 6.0 // the most that one follower may say, in natural logarithms
)

// implied is what a follower says its reference must have been, with its deviation.
type implied struct{ m, dev float64 }

// wrongs finds the references that do not fit. Their followers are then held against what the others imply, or not at all.
func (p *Pool) wrongs(r *Result) {
	for _, b := range p.benchmarks {
		if x := p.looks[b].x; x != x {
			continue
		}
		said := p.said(b)
		if len(said) < leastFollowers {
			continue
		}
		m, odds := p.contradiction(said, p.looks[b].x)
		if odds <= 0 {
			continue
		}
		p.states[b].isOut = true
		p.states[b].isWrong = true
		r.Wrong = append(r.Wrong, WrongSeries{Member: b, Followers: len(said), Implied: rules.Some(m)})
		for _, i := range p.followers[b] {
			p.rejudge(i)
		}
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
	slices.SortFunc(said, func(a, b implied) int {
		if a.m < b.m {
			return -1
		}
		return 1
	})
	return said
}

func (p *Pool) say(i int) (v implied, ok bool) {
	lk, f := &p.looks[i], &p.states[i].fit
	if !lk.hasRef || !lk.judged || f.slope < 0.2 {
		return v, false
	}
	return implied{lk.m + float64((lk.x-lk.mu)/f.slope), lk.s / f.slope}, true
}

// contradiction is the return that followers agree on, their weighted median, and the logarithm of the odds that the reference is wrong.
func (p *Pool) contradiction(said []implied, m float64) (agreed, odds float64) {
	agreed = weightedMedian(said)
	odds = math.Log(priorWrong)
	b, better := &bells[usual], 0
	for _, v := range said {
		gain := math.Log(b.at((v.m-agreed)/v.dev) / b.at((v.m-m)/v.dev))
		odds += min(max(gain, -followerCap), followerCap)
		if gain > 1 {
			better++
		}
	}
	if 2*better < len(said) || better < leastFollowers {
		return agreed, math.Inf(-1)
	}
	return agreed, odds
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

// rejudge holds a follower against nothing but its own past.
func (p *Pool) rejudge(i int) {
	lk := &p.looks[i]
	if lk.x != lk.x {
		return
	}
	lk.m = math.NaN()
	p.prepare(i)
}
