package causes

import (
	"math"
	"slices"
)

// watchZ is where the watch line of 1 % lies under a t5 of unit variance, and breachZ that of 0.27 % (stats.ScaledT(5)).
const (
	watchZ      = 3.123
	breachZ     = 4.273
	leastMarket = 8 // members that report
)

// markets finds the groups whose median |z| is past the watch line.
func (p *Pool) markets(r *Result) {
	for g, group := range p.peers {
		row, sizes := p.row[:0], p.sizes[:0]
		for _, i := range group {
			if lk := &p.looks[i]; lk.judged {
				row = append(row, ranked{lk.x, i})
				sizes = append(sizes, math.Abs(lk.ownZ))
			}
		}
		p.row, p.sizes = row, sizes
		if len(row) < leastMarket {
			continue
		}
		slices.Sort(sizes)
		if z := middle(sizes); z > watchZ {
			r.Markets = append(r.Markets, p.market(g, row, z))
		}
	}
}

func (p *Pool) market(g int, row []ranked, z float64) Market {
	slices.SortFunc(row, byValue)
	n := len(row)
	m := Market{Group: g, Median: (row[(n-1)/2].x + row[n/2].x) / 2, MedianZ: z, Reporting: n}
	for _, r := range row {
		if p.still(r.member, m.Median, z) {
			if math.Abs(p.looks[r.member].ownZ) > watchZ {
				m.Otherwise = append(m.Otherwise, r.member)
			} else {
				m.NotMoved = append(m.NotMoved, r.member)
			}
		}
	}
	slices.Sort(m.NotMoved)
	slices.Sort(m.Otherwise)
	return m
}

// still says that a member did not take part in a move: it is a quarter or less of what its reference foresees, or of what its group did,
// each by its own deviation, and its reference leaves it unexplained.
func (p *Pool) still(i int, median, z float64) bool {
	lk := &p.looks[i]
	foreseen := math.Copysign(z*lk.own, median)
	if lk.hasRef {
		foreseen = lk.mu
		if math.Abs(lk.z) < watchZ {
			return false
		}
	}
	return lk.x*math.Copysign(1, foreseen) < math.Abs(foreseen)/4
}

func middle(sorted []float64) float64 {
	n := len(sorted)
	return (sorted[(n-1)/2] + sorted[n/2]) / 2
}
