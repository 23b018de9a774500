package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// The tail of an auto range is learnt once a week, by the slow-burn checks, from the newest values of each group; the ledger keeps it among the
// scales that groups lend. It holds for dates after the newest that was held then: so no date is ever judged again under another.

// tailsOf names a group among the scales for the tail that it has learnt.
func tailsOf(group string) string { return "\x00tail\x00" + group }

// learntFor picks the degrees of freedom that hold on a date, 0 for none.
func learntFor(scales []GroupScale, date rules.Date) float64 {
	n, _ := slices.BinarySearchFunc(scales, date, func(s GroupScale, at rules.Date) int { return cmp.Compare(s.Date, at) })
	if n == 0 {
		return 0
	}
	return scales[n-1].Deviation
}

// learnt is the degrees of freedom that a group has learnt under a lane's range, 0 for none.
func (g *groupScales) learnt(l *lane, group string, date rules.Date) float64 {
	if l.gauge.Range.Tail.Name != rules.Auto {
		return 0
	}
	g.mu.Lock()
	defer g.mu.Unlock()
	key := scaleKey{l.id, tailsOf(group), rules.NoDate}
	list, ok := g.tails[key]
	if !ok {
		var err error
		if list, err = g.view.GroupScales(key.id, key.group); err != nil {
			g.err = err
		}
		g.tails[key] = list
	}
	return learntFor(list, date)
}

// learnt is the degrees of freedom by which a reader judges a date.
func (r *Reader) learnt(g *rules.Gauge, id uint16, group string, date rules.Date) (float64, error) {
	if g.Range.Tail.Name != rules.Auto {
		return 0, nil
	}
	list, err := r.View.GroupScales(id, tailsOf(group))
	return learntFor(list, date), err
}

// count counts the far values of one series under every auto range that judges it.
func (s *slowScan) count(id uint32, name string) {
	at, group := int(id%BlockSize), s.j.members.Group(name)
	for n, g := range s.j.gauges {
		if g.Range.Tail.Name != rules.Auto || g.Range.Limit != nil || s.j.ids[n] == 0 || !s.j.members.Applies(n, name, group) {
			continue
		}
		from := s.raw
		if g.Range.Of == rules.Residual {
			from = s.residuals
		}
		var values []float64
		for k := range s.dates {
			if v := from[k*BlockSize+at]; v != Missing64 && s.raw[k*BlockSize+at] != Missing64 {
				values = append(values, rules.Units(v).Float())
			}
		}
		key := scaleKey{s.j.ids[n], tailsOf(group), rules.NoDate}
		if s.counts[key] == nil {
			s.counts[key] = &rules.Exceedances{}
		}
		s.counts[key].Add(&g.Range, values)
	}
}

// tails are what the groups have learnt, where there was enough to learn from.
func (s *slowScan) tails(newest rules.Date, step uint32) (out []GroupScale) {
	for key, e := range s.counts {
		if e.N >= rules.LearntFrom {
			out = append(out, GroupScale{Range: key.id, Group: key.group, Date: newest, Step: step, Deviation: e.DF(), Series: uint32(e.N)})
		}
	}
	slices.SortFunc(out, func(x, y GroupScale) int { return cmp.Or(cmp.Compare(x.Range, y.Range), cmp.Compare(x.Group, y.Group)) })
	return out
}

// learns says that some range learns its tail.
func (j *judging) learns() bool {
	return slices.ContainsFunc(j.gauges, func(g *rules.Gauge) bool { return g.Range.Tail.Name == rules.Auto })
}
