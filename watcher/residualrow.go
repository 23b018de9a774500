package watcher

import (
	"slices"
	"sort"

	"strayd/rules"
)

// valueOn is the newest of some versions of a date as of a step, Missing64 where there is none.
func valueOn(versions []Version, date rules.Date, step uint32) int64 {
	value := int64(Missing64)
	at := sort.Search(len(versions), func(i int) bool { return versions[i].Date >= date })
	for ; at < len(versions) && versions[at].Date == date && versions[at].Step <= step; at++ {
		value = versions[at].Value
	}
	return value
}

// judgeResidual fills in a row's verdict under a residual range: as it was given when the residual of the version first was there.
func (r *Reader) judgeResidual(s *seriesPast, n int, v Version, set *recorded, k int, used []Version, terms rules.Terms, row *Row,
	windows bool) error {
	g := set.gauges[k]
	if !terms.Daily() {
		row.Verdict = rules.Verdict{Finding: rules.NotJudged, Why: spanResidual(terms.Days)}
		return nil
	}
	if set.residuals == 0 {
		row.Verdict = rules.Verdict{Finding: rules.NotJudged, Why: WhyNoResidual(set.members.Reference(s.name, s.group))}
		return nil
	}
	kept, err := r.usedOf(s, set.residuals)
	if err != nil {
		return err
	}
	first := slices.IndexFunc(kept, func(x Version) bool { return x.Date == v.Date && x.Step >= v.Step && x.Value != Missing64 })
	if first < 0 {
		row.Verdict = rules.Verdict{Finding: rules.NotJudged, Why: WhyNoResidual(set.members.Reference(s.name, s.group))}
		return nil
	}
	residual := kept[first]
	w := s.window(n, v.Date, residual.Step, g, used, kept)
	if w.past.DF, err = r.learnt(g, set.ids[k], s.group, v.Date); err != nil {
		return err
	}
	verdict := g.Judge(rules.Units(residual.Value), &w.past)
	row.Verdict = towards(verdict, (row.Return - rules.Units(residual.Value)).Float())
	row.residual = rules.Units(residual.Value)
	row.WindowFrom, row.WindowTo, row.Residual = w.from, w.to, rules.Some(rules.Units(residual.Value).Float())
	row.Used = rules.Units(usedAt(used, v.Date, valueOn(kept, v.Date, ^uint32(0)), ^uint32(0)))
	if windows {
		row.Window = w.list()
	}
	return nil
}
