package watcher

import (
	"strayd/rules"
)

// Expected is what would be in range for one series under one range.
type Expected struct {
	Series string
	Range  string
	rules.Verdict
}

// Expect tells, for every series and range under the settings recorded last, what would be in range on a date. It calls each
// in the order of the series' numbers, then of the configuration, until it gives an error.
func (p *Pass) Expect(on rules.Date, each func(Expected) error) error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	defer v.Close()
	last, err := v.LastSettings()
	if err != nil || last == 0 {
		return err
	}
	text, err := v.Settings(last)
	if err != nil {
		return err
	}
	recorded, err := ParseSettings(text)
	if err != nil {
		return err
	}
	recorded.Register = p.Settings.Register
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
	for _, t := range tasks(allBlocks(names.Len()), j.width, rules.NoDate) {
		if err := w.expect(t, on, each); err != nil {
			return err
		}
	}
	return nil
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
				if past = l.past(i); past.N > 0 && rules.Weekdays(l.last[i], on) > rules.DormantAfter {
					past = &rules.Past{Dormant: true}
				}
				past.Group = w.j.scales.lent(l, w.group(i), on)
			}
			if !judges {
				continue
			}
			if err := each(Expected{id, g.Range.Name, g.Expect(past)}); err != nil {
				return err
			}
		}
	}
	return nil
}
