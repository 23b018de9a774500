package causes

import (
	"math"

	"strayd/rules"
)

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
	if p.isReference[i] || !p.looks[i].hasRef || !p.odd(i, leastOdd) {
		return
	}
	best := odd{cause: rules.CauseSwapped, partner: -1}
	c := &p.states[i].chain
	for k := range p.slow {
		j := p.slow[k].member
		if j == i || p.isReference[j] || !p.odd(j, leastOdd/2) || p.members[j].Group == p.members[i].Group {
			continue
		}
		if !p.couldBe(i, j) || !p.couldBe(j, i) {
			continue
		}
		like := p.exchanged(i, j) * p.exchanged(j, i) / p.totals[k]
		prior := priorSwap / float64(len(p.members))
		if c.partner == j { // what yesterday carries counts for the same partner only
			prior += c.carry[runSwapped]
		}
		if weight := prior * like; weight > best.weight {
			best.weight, best.ratio, best.partner = weight, like/w.ordinary, j
		}
	}
	if best.partner < 0 {
		return
	}
	if c.partner != best.partner {
		c.restart(runSwapped)
		c.partner = best.partner
	}
	c.note(runSwapped, best.ratio/float64(len(p.members)))
	best.implied = rules.Some(p.looks[best.partner].x)
	w.odds = append(w.odds, best)
}

// leastOdd is how many deviations a value must be off to be taken for another series'. Half as many do for the partner, and a swap that
// goes on needs none.
const leastOdd = 2.5

func (p *Pool) odd(i int, deviations float64) bool {
	lk := &p.looks[i]
	return math.Abs(lk.z) > deviations || lk.coupled || p.states[i].chain.carry[runSwapped] > leastCarried
}

// couldBe says that j's value is not far off for i.
func (p *Pool) couldBe(i, j int) bool {
	a := &p.looks[i]
	return math.Abs(p.looks[j].x-a.mu) < 6*a.s
}

// exchanged is the probability that i's true value is printed as j's is now.
func (p *Pool) exchanged(i, j int) float64 {
	a, b := &p.looks[i], &p.looks[j]
	width := a.tick
	if int(b.places) > a.digits {
		width *= a.rare
	}
	return width * a.fits(b.x)
}

// total is the weight of all that may explain a value, but for a swap.
func (w *weighing) total() float64 {
	t := w.ordinary + w.genuine
	for _, o := range w.odds {
		t += o.weight
	}
	return t
}
