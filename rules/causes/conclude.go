package causes

import (
	"cmp"
	"math"
	"slices"

	"strayd/rules"
)

// conclude says what a weighed value comes to, and notes its log odds for the lines to come.
func (p *Pool) conclude(w *weighing, r *Result) {
	i := w.member
	lk, st := &p.looks[i], &p.states[i]
	logOdds, best := w.logOdds(), w.best()
	lk.total = w.total()
	h := p.histogramOf(i)
	beyond := math.Abs(lk.z) > breachZ || math.Abs(lk.ownZ) > breachZ
	if logOdds > lowest && !beyond {
		p.odds[h].take(p.t, logOdds)
		p.odds[len(p.odds)-1].take(p.t, logOdds)
	}
	far := math.Abs(lk.z) > watchZ || math.Abs(lk.ownZ) > watchZ
	v := View{LogOdds: logOdds, Out: logOdds > 0 || lk.reversal > 0}
	if far || logOdds > leastLine {
		v.Line = p.doubtFrom(h)
	}
	if best >= 0 && lk.reversal == 0 && logOdds > leastLine && logOdds > v.Line && w.odds[best].ratio > math.E {
		v.Kind = kindOf(w.odds[best].cause, st)
	}
	if v.Kind == "" && !beyond && lk.reversal == 0 {
		v.Out = false // nothing is left out in silence
	}
	if v.Out {
		v.Use, st.isOut = Out, true
	}
	st.chain.next()
	if v.Kind != "" || v.Out || far || math.Abs(lk.ownZ) > narrowZ {
		p.describe(i, lk, &v)
		p.shares(w, lk, &v)
		r.Views = append(r.Views, v)
	}
}

// narrowZ is from where a value may lie beyond a range of the caller's, which may be narrower than the pool's own past says.
const narrowZ = 2.5

// logOdds is the logarithm of the odds of an error against anything else.
func (w *weighing) logOdds() float64 {
	errors := 1e-300
	for _, o := range w.odds {
		errors += o.weight
	}
	return math.Log(errors) - math.Log(w.ordinary+w.genuine)
}

// best is the heaviest error, -1 for none.
func (w *weighing) best() int {
	best := -1
	for k, o := range w.odds {
		if best < 0 || o.weight > w.odds[best].weight {
			best = k
		}
	}
	return best
}

// kindOf is the kind of flag that the leading cause asks for.
func kindOf(c rules.Cause, st *state) rules.Kind {
	switch c {
	case rules.CauseZero:
		return rules.KindStale
	case rules.CauseRepeat:
		if st.unchanged > 0 {
			return rules.KindStale
		}
		return rules.KindRepeat
	}
	return rules.KindDoubtful
}

// shares ranks the odd explanations: shares are given that the day is not ordinary.
func (p *Pool) shares(w *weighing, lk *look, v *View) {
	if lk.reversal > 0 {
		v.LooksLike, v.Share = rules.CauseSpike, lk.reversal/(1+lk.reversal)
		v.Causes = []rules.Share{{Cause: rules.CauseSpike, Share: v.Share}}
		return
	}
	merged := p.merge(w.odds)
	merged = append(merged, odd{cause: rules.CauseGenuine, weight: w.genuine})
	v.Explained = explained(lk)
	if v.Explained && v.Kind == "" {
		merged = append(merged, odd{cause: rules.CauseMarket, weight: w.ordinary})
	}
	slices.SortStableFunc(merged, func(a, b odd) int { return cmp.Compare(b.weight, a.weight) })
	total := 0.0
	for _, o := range merged {
		total += o.weight
	}
	for _, o := range merged {
		if share := o.weight / total; share >= leastShown {
			v.Causes = append(v.Causes, rules.Share{Cause: o.cause, Share: share, Implied: o.implied})
		}
	}
	if c := v.Causes[0]; c.Share > needed(c.Cause) {
		v.LooksLike, v.Share, v.Implied = c.Cause, c.Share, c.Implied
	}
}

// leastShown is the least share that is listed.
const leastShown = 0.005

// needed is the share above which a cause is named: half, and more where the name says that there is no better explanation.
func needed(c rules.Cause) float64 {
	if c == rules.CauseGenuine {
		return 0.85
	}
	return 0.5
}

// merge adds up the weights of the same cause; the implied return is that of the heaviest.
func (p *Pool) merge(odds []odd) []odd {
	merged := p.merged[:0]
	for _, o := range odds {
		k := slices.IndexFunc(merged, func(m odd) bool { return m.cause == o.cause })
		switch {
		case k < 0:
			merged = append(merged, o)
		case o.weight > merged[k].weight:
			o.weight += merged[k].weight
			merged[k] = o
		default:
			merged[k].weight += o.weight
		}
	}
	p.merged = merged
	return merged
}

// explained says that a return is beyond its own range and the reference foresees it.
func explained(lk *look) bool {
	return lk.hasRef && math.Abs(lk.ownZ) > watchZ && math.Abs(lk.z) < watchZ && math.Abs(lk.mu) > 2*lk.own
}

// view is a view of a value with the figures of its reference.
func (p *Pool) view(i int, lk *look) View {
	var v View
	p.describe(i, lk, &v)
	return v
}

// describe fills in whose value it is and the figures of the reference.
func (p *Pool) describe(i int, lk *look, v *View) {
	v.Member, v.Date, v.Z, v.OwnZ = i, p.date, lk.z, lk.ownZ
	if !lk.hasRef {
		return
	}
	v.Reference = "peers"
	if r := p.members[i].Reference; r.Kind == Series {
		v.Reference = p.members[r.Series].ID
	}
	v.ReferenceReturn, v.Residual, v.Deviation = rules.Some(lk.m), rules.Some(lk.x-lk.mu), rules.Some(lk.s)
}
