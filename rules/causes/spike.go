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
// against all else that explains either day.
func (p *Pool) spikes(r *Result) {
	for k := range p.slow {
		w := &p.slow[k]
		h, lk := &p.states[w.member].held, &p.looks[w.member]
		if !h.is || h.t != p.t-1 {
			continue
		}
		odds := p.spike(w.member, &h.look, lk) / w.total()
		if odds <= 1 {
			continue
		}
		h.is, lk.reversal = false, odds
		r.Earlier = append(r.Earlier, p.settled(w.member, &h.look, odds))
	}
}

// spike is the weight of a spike and its reversal over that of all else which explains the first of the two values.
func (p *Pool) spike(i int, a, b *look) float64 {
	size := math.Abs(a.x)
	if a.x <= -1 || size < 3*a.s || (b.x > 0) == (a.x > 0) {
		return 0
	}
	both := float64((1+a.x)*(1+b.x)) - 1
	deviation := math.Sqrt(float64(a.s*a.s) + float64(b.s*b.s))
	fit := usual.at((both-a.mu-b.mu)/deviation) / deviation * (1 + a.x)
	return priorSpike * fit * b.width() * a.width() / (2 * size * math.Log(200)) / a.total
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
