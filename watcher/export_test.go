package watcher

import "strayd/rules/causes"

// Weigher is what may stand in for a causes.Pool.
type Weigher = weigher

// SetWeigher has a pass weigh with a stand-in.
func (p *Pass) SetWeigher(make func(members []causes.Member, groups []string) Weigher) {
	p.newWeigher = func(m []causes.Member, g []string, _ float64) weigher { return make(m, g) }
}
