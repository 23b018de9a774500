package causes

import (
	"math"

	"strayd/rules"
)

// spikes settles values of the date before that today takes back: a wrong price makes one return wrong, and the next one the other way.
// Under it both days together are ordinary, and the first return may be anything:
//
//	prior x density of (1+r1)(1+r2)-1 about both days' centres x 1/(2 |r1| ln 200)
//
// against all else that explains either day. It reports the odds for the values of today, 0 for most.
func (p *Pool) spikes(r *Result) {
	for i := range p.members {
		h, lk := &p.states[i].held, &p.looks[i]
		if !h.is || h.t != p.t-1 || !lk.judged {
			continue
		}
		odds := p.spike(i, &h.look, lk)
		if odds <= 1 {
			continue
		}
		h.is, lk.reversal = false, odds
		r.Earlier = append(r.Earlier, p.settled(i, &h.look, odds))
	}
}

// spike is the odds of a spike and its reversal against the two days each by itself.
func (p *Pool) spike(i int, a, b *look) float64 {
	size := math.Abs(a.x)
	if a.x <= -1 || size < 3*a.s || (b.x > 0) == (a.x > 0) {
		return 0
	}
	both := float64((1+a.x)*(1+b.x)) - 1
	deviation := math.Sqrt(a.s*a.s + b.s*b.s)
	fit := p.bell(i).at((both-a.mu-b.mu)/deviation) / deviation * (1 + a.x)
	joint := priorSpike * fit * b.width() * a.width() / (2 * size * math.Log(200))
	today := p.ordinary(i) + p.rate(i)*p.genuine(b)
	return joint / (a.total * today)
}

func (p *Pool) settled(i int, a *look, odds float64) View {
	share := odds / (1 + odds)
	implied := rules.Some(a.mu)
	v := p.view(i, a)
	v.Date = p.before
	v.Causes = []rules.Share{{Cause: rules.CauseSpike, Share: share, Implied: implied}}
	v.LooksLike, v.Share, v.Implied, v.Out, v.Use = rules.CauseSpike, share, implied, true, Out
	return v
}
