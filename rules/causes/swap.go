package causes

import "strayd/rules"

// swaps weighs, for every pair of odd values of different groups, that the two were exchanged. A partner is judged against whatever else
// explains it, or one bad row would blame its many possible partners; and it is never of the same group, where the reference holds both.
func (p *Pool) swaps() {
	n := len(p.slow)
	if n < 2 {
		return
	}
	p.totals = p.totals[:0]
	for k := range p.slow {
		p.totals = append(p.totals, p.slow[k].total())
	}
	for k := range p.slow {
		p.swapsOf(&p.slow[k])
	}
}

func (p *Pool) swapsOf(w *weighing) {
	i := w.member
	if p.isReference[i] || !p.looks[i].hasRef {
		return
	}
	best, bestLike := -1, 0.0
	for k := range p.slow {
		j := p.slow[k].member
		if j == i || p.isReference[j] || p.members[j].Group == p.members[i].Group {
			continue
		}
		like := p.exchanged(i, j) * p.exchanged(j, i) / p.totals[k]
		if p.states[i].chain.partner == j {
			like *= 4 // yesterday's partner wins a tie
		}
		if like > bestLike {
			best, bestLike = j, like
		}
	}
	if best < 0 {
		return
	}
	p.addSwap(w, best, bestLike)
}

// addSwap enters the best partner. What yesterday carries counts for the same partner only.
func (p *Pool) addSwap(w *weighing, partner int, like float64) {
	c := &p.states[w.member].chain
	prior := priorSwap / float64(len(p.members))
	if c.partner == partner {
		like /= 4
		prior += c.carry[runSwapped]
	} else {
		c.restart(runSwapped)
	}
	c.partner = partner
	ratio := like / w.ordinary
	c.note(runSwapped, ratio/float64(len(p.members)))
	w.odds = append(w.odds, odd{rules.CauseSwapped, prior * like, ratio, rules.Some(p.looks[partner].x), partner})
}

// exchanged is the probability that i's true value is printed as j's is now.
func (p *Pool) exchanged(i, j int) float64 {
	a, b := &p.looks[i], &p.looks[j]
	width := a.tick
	if int(b.places) > a.digits {
		width *= a.rare
	}
	return width * p.fits(i, a, b.x)
}

// total is the weight of all that may explain a value, but for a swap.
func (w *weighing) total() float64 {
	t := w.ordinary + w.genuine
	for _, o := range w.odds {
		t += o.weight
	}
	return t
}
