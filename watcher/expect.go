package watcher

import (
	"strayd/rules"
)

// Expected is what would be in range for one series under one range.
type Expected struct {
	Series string
	Range  string
	rules.Verdict
	Limited bool // the range is a limit: nothing is estimated
}

// Expect tells, for one series (or, with "", for all) and every range under the settings recorded last, what would be in range
// on a date. It calls each in the order of the series' numbers, then of the configuration, until it gives an error.
func (p *Pass) Expect(only string, on rules.Date, each func(Expected) error) error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	defer v.Close()
	last, recorded, err := lastSettings(v)
	if err != nil || last == 0 {
		return err
	}
	p.Settings = *recorded
	names, err := v.Names()
	if err != nil {
		return err
	}
	j := &judging{names: names, heldNames: names.Len(), now: p.Now, step: v.Step()}
	if err := p.prepare(j, v); err != nil {
		return err
	}
	j.scales = newGroupScales(j, v, nil)
	w := newWorker(j, v)
	todo := tasks(allBlocks(names.Len(), rules.NoDate), j.width)
	if only != "" {
		todo = taskOf(names, only)
	}
	for _, t := range todo {
		if err := w.expect(t, on, each); err != nil {
			return err
		}
	}
	return nil
}

// taskOf is the task of one series; none when it is not there.
func taskOf(names *Names, series string) []task {
	id, ok := names.Find([]byte(series))
	if !ok {
		return nil
	}
	return []task{{block: id / BlockSize, from: int(id % BlockSize), width: 1, since: rules.NoDate}}
}

func (w *worker) expect(t task, on rules.Date, each func(Expected) error) error {
	w.begin(t)
	if err := w.noteNewest(t, nil); err != nil {
		return err
	}
	if err := w.load(t, on); err != nil {
		return err
	}
	for i := range t.width {
		id := string(w.j.names.Name(t.series(i)))
		lane := 0
		for n, g := range w.j.gauges {
			var past *rules.Past
			judges := w.applies(n, i)
			if g.Range.Limit == nil {
				l := w.lanes[lane]
				lane++
				if past = l.past(i); past.N > 0 && l.between(i, l.last[i], on) > rules.DormantAfter {
					past = &rules.Past{Dormant: true}
				}
				past.DF = w.j.scales.learnt(l, w.group(i), on)
				if !l.residual {
					past.Group = w.j.scales.lent(l, w.group(i), on)
				}
			}
			if !judges {
				continue
			}
			if err := each(Expected{id, g.Range.Name, w.expected(g, past, id, i), g.Range.Limit != nil}); err != nil {
				return err
			}
		}
	}
	return nil
}

// expected is what would be in range next. Of a residual range it is said for the residual: what the reference will do is not known.
func (w *worker) expected(g *rules.Gauge, past *rules.Past, id string, i int) rules.Verdict {
	if g.Range.Of != rules.Residual || g.Range.Limit != nil {
		return g.Expect(past)
	}
	reference := w.j.members.Reference(id, w.group(i))
	v := g.Expect(past)
	switch {
	case reference == "" || v.N == 0 && !past.Dormant:
		v = rules.Verdict{Finding: rules.NotJudged, Why: WhyNoResidual(reference)}
	case v.Finding != rules.NotJudged:
		v.Why = join("of the residual: what its reference "+reference+" foresees comes on top", v.Why)
	}
	return v
}
