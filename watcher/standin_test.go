package watcher_test

import (
	"math"
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
	"strayd/watcher"
)

// plainPool stands in for the pool, with rules that are easy to tell. It keeps the newest span values of each member that it took, and
// takes none that it finds odd. A value beyond four times their mean size is doubtful, beyond eight times it is out. One that takes back
// such a value of the date before looks like a spike and is out too. A group whose median size is beyond three times is a market day.
type plainPool struct {
	members []causes.Member
	groups  []string
	kept    [][]float64
	last    []oddity // of the date before
}

const span = 20

type oddity struct {
	odd   bool
	value float64
	date  rules.Date
}

func newPlainPool(m []causes.Member, g []string) watcher.Weigher {
	return &plainPool{m, g, make([][]float64, len(m)), make([]oddity, len(m))}
}

func (p *plainPool) size(m int) float64 {
	if len(p.kept[m]) < 10 {
		return math.Inf(1)
	}
	sum := 0.0
	for _, x := range p.kept[m] {
		sum += math.Abs(x)
	}
	return sum / float64(len(p.kept[m]))
}

func (p *plainPool) Step(d causes.Day) *causes.Result {
	r := &causes.Result{Foreseen: make([]rules.Num, len(p.members))}
	for m, x := range d.Values {
		if ref := p.members[m].Reference; ref.Kind == causes.Series && d.Values[ref.Series] != rules.Missing {
			r.Foreseen[m] = rules.Some(0.5 * d.Values[ref.Series].Float())
		}
		if x == rules.Missing {
			continue
		}
		view := p.look(d.Date, m, x.Float(), r)
		use := causes.AsIs
		if d.Fresh == nil || d.Fresh[m] {
			if use = view.Use; use != causes.AsIs {
				r.Views = append(r.Views, view)
			}
		}
		value := x.Float()
		for _, k := range d.Known {
			if k.Member == m {
				if use = k.Use; use == causes.Instead {
					value = k.Value.Float()
				}
			}
		}
		p.last[m] = oddity{use != causes.AsIs && use != causes.Instead, x.Float(), d.Date}
		if use == causes.AsIs || use == causes.Instead {
			p.kept[m] = append(p.kept[m], value)
			p.kept[m] = p.kept[m][max(0, len(p.kept[m])-span):]
		}
	}
	p.markets(d, r)
	return r
}

func (p *plainPool) look(date rules.Date, m int, x float64, r *causes.Result) causes.View {
	v := causes.View{Member: m, Date: date, LogOdds: 2, Line: 1}
	size := p.size(m)
	before := p.last[m]
	switch {
	case before.odd && math.Abs(x+before.value) < math.Abs(before.value)/4:
		spike := causes.View{Member: m, Date: before.date, LooksLike: rules.CauseSpike, Share: 0.9, Out: true, Use: causes.Out}
		r.Earlier = append(r.Earlier, spike)
		v.LooksLike, v.Share, v.Out, v.Use = rules.CauseSpike, 0.9, true, causes.Out
	case r.Foreseen[m].OK && math.Abs(x) < 4*size && math.Abs(x-r.Foreseen[m].V) > 2*size:
		v.Kind, v.LooksLike, v.Share, v.Implied, v.Reference = rules.KindDoubtful, rules.CauseSign, 0.8, rules.Some(-x), "index"
		v.ReferenceReturn, v.Residual, v.Use = rules.Some(2*r.Foreseen[m].V), rules.Some(x-r.Foreseen[m].V), causes.Clipped
	case math.Abs(x) > 8*size:
		v.Kind, v.LooksLike, v.Share, v.Implied, v.Out, v.Use = rules.KindDoubtful, rules.CauseX100, 0.7, rules.Some(x/100), true, causes.Out
	case math.Abs(x) > 4*size:
		v.Kind, v.LooksLike, v.Share, v.Use = rules.KindDoubtful, rules.CauseGenuine, 0.6, causes.Clipped
	}
	return v
}

func (p *plainPool) markets(d causes.Day, r *causes.Result) {
	for g := range p.groups {
		var sizes, values []float64
		var still []int
		for m, x := range d.Values {
			if p.members[m].Group != g || x == rules.Missing {
				continue
			}
			z := math.Abs(x.Float()) / p.size(m)
			sizes, values = append(sizes, z), append(values, x.Float())
			if z < 1 {
				still = append(still, m)
			}
		}
		slices.Sort(sizes)
		slices.Sort(values)
		if n := len(sizes); n >= 3 && sizes[n/2] > 3 {
			r.Markets = append(r.Markets, causes.Market{Group: g, Median: values[n/2], MedianZ: sizes[n/2], Reporting: n, NotMoved: still})
		}
	}
}
