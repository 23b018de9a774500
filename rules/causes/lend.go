package causes

import "slices"

// lending is what a group lends to members with few values: the medians of its members' variances.
type lending struct {
	t         int
	own, rest float64
}

func (p *Pool) lends(i int) bool {
	g := p.members[i].Group
	return g >= 0 && p.lendingOf(g).own > 0
}

// lent is the variance of returns or of residuals that a group lends.
func (p *Pool) lent(i int, rest bool) float64 {
	g := p.members[i].Group
	if g < 0 || p.states[i].own.n[2] >= guard {
		return 0
	}
	if rest {
		return p.lendingOf(g).rest
	}
	return p.lendingOf(g).own
}

func (p *Pool) lendingOf(g int) *lending {
	l := &p.lend[g]
	if l.t == p.t {
		return l
	}
	l.t = p.t
	l.own = p.median(g, func(st *state) *scale { return &st.own })
	l.rest = p.median(g, func(st *state) *scale { return &st.rest })
	return l
}

func (p *Pool) median(g int, of func(*state) *scale) float64 {
	sizes := p.sizes[:0]
	for _, i := range p.peers[g] {
		if s := of(&p.states[i]); s.n[2] >= guard {
			sizes = append(sizes, s.variance(s.mean(), 0))
		}
	}
	p.sizes = sizes
	if len(sizes) < 3 {
		return 0
	}
	slices.Sort(sizes)
	return middle(sizes)
}

// rate is how often something happens to a series: learnt from how many values of its group lie beyond the breach line of the residual and are
// no errors, beyond those that the tail itself brings about.
func (p *Pool) rate(i int) float64 { return p.happens[p.histogramOf(i)] }
