package causes

import (
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
	beyond := math.Abs(lk.z) > breachZ || math.Abs(lk.ownZ) > breachZ
	if logOdds > lowest && !beyond {
		h := p.histogramOf(i)
		p.odds[h].take(p.t, logOdds)
		p.odds[len(p.odds)-1].take(p.t, logOdds)
	}
	line := p.line[p.histogramOf(i)]
	v := p.view(i, lk)
	v.LogOdds, v.Line = logOdds, line
	p.shares(w, lk, &v)
	if lk.reversal > 0 {
		v.LooksLike, v.Share = rules.CauseSpike, lk.reversal/(1+lk.reversal)
		v.Causes = []rules.Share{{Cause: rules.CauseSpike, Share: v.Share}}
		v.Out = true
	} else if best >= 0 && logOdds > line && w.odds[best].ratio > math.E {
		v.Kind = kindOf(w.odds[best].cause, st)
	}
	if v.Out {
		v.Use, st.isOut = Out, true
	}
	st.chain.next()
	if v.Kind != "" || v.Out || math.Abs(lk.z) > watchZ || math.Abs(lk.ownZ) > watchZ {
		r.Views = append(r.Views, v)
	}
}

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
	merged := merge(w.odds)
	if lk.reversal == 0 {
		merged = append(merged, odd{cause: rules.CauseGenuine, weight: w.genuine})
	}
	if explained(lk) {
		v.Explained = true
		merged = append(merged, odd{cause: rules.CauseMarket, weight: w.ordinary})
	}
	total := 0.0
	for _, o := range merged {
		total += o.weight
	}
	slices.SortStableFunc(merged, func(a, b odd) int {
		switch {
		case a.weight > b.weight:
			return -1
		case a.weight < b.weight:
			return 1
		}
		return 0
	})
	errors := 0.0
	for _, o := range merged {
		share := o.weight / total
		if share >= 0.005 {
			v.Causes = append(v.Causes, rules.Share{Cause: o.cause, Share: share, Implied: o.implied})
		}
		if o.cause != rules.CauseGenuine && o.cause != rules.CauseMarket {
			errors += share
		}
	}
	if len(v.Causes) > 0 && v.Causes[0].Share > needed(v.Causes[0].Cause) {
		c := v.Causes[0]
		v.LooksLike, v.Share, v.Implied = c.Cause, c.Share, c.Implied
	}
	v.Out = v.LogOdds > 0
}

// needed is the share above which a cause is named: half, and more where the name says that there is no better explanation.
func needed(c rules.Cause) float64 {
	if c == rules.CauseGenuine {
		return 0.8
	}
	return 0.5
}

// merge adds up the weights of the same cause; the implied return is that of the heaviest.
func merge(odds []odd) []odd {
	var merged []odd
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
	return merged
}

// explained says that a return is beyond its own range and the reference foresees it.
func explained(lk *look) bool {
	return lk.hasRef && math.Abs(lk.ownZ) > watchZ && math.Abs(lk.z) < watchZ && math.Abs(lk.mu) > 2*lk.own
}

// view fills in the figures of the reference.
func (p *Pool) view(i int, lk *look) View {
	v := View{Member: i, Date: p.date, Z: lk.z, OwnZ: lk.ownZ}
	if !lk.hasRef {
		return v
	}
	v.Reference = "peers"
	if r := p.members[i].Reference; r.Kind == Series {
		v.Reference = p.members[r.Series].ID
	}
	v.ReferenceReturn, v.Residual, v.Deviation = rules.Some(lk.m), rules.Some(lk.x-lk.mu), rules.Some(lk.s)
	return v
}
