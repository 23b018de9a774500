package causes

import "slices"

// Clone copies a pool: what one of the two goes through after that does not touch the other.
func (p *Pool) Clone() *Pool {
	c := *p
	c.states, c.looks = slices.Clone(p.states), slices.Clone(p.looks)
	for i := range c.states {
		st := &c.states[i]
		st.own.sorted, st.rest.sorted = slices.Clone(st.own.sorted), slices.Clone(st.rest.sorted)
	}
	c.odds, c.line, c.lend = slices.Clone(p.odds), slices.Clone(p.line), slices.Clone(p.lend)
	for i := range c.odds {
		days := &c.odds[i].days
		for t := range days {
			days[t].bins = slices.Clone(days[t].bins)
		}
	}
	c.alike = slices.Clone(p.alike)
	c.happens = slices.Clone(p.happens)
	c.scratch = scratch{}
	return &c
}
