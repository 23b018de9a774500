package watcher

import (
	"math"

	"strayd/rules"
)

// residualKey names what the ledger keeps of residuals, as a range of its own: for every value that had a reference when it was judged, the
// return less what the reference foresaw of it. Residual ranges keep their windows of these.
const residualKey = "residuals"

// residuals are those of one date of a task.
type residuals struct {
	now    []int64 // Missing64 where there is none
	before []int64 // what the ledger holds
	fresh  []int64 // those judged now
}

func newResiduals(width int) *residuals {
	return &residuals{make([]int64, width), make([]int64, width), make([]int64, width)}
}

// ofResiduals says that some range judges residuals.
func (j *judging) ofResiduals() bool {
	for _, g := range j.gauges {
		if g.Range.Of == rules.Residual && g.Range.Limit == nil {
			return true
		}
	}
	return false
}

// residualsOf turns what references foresee of a date into residuals by member, Missing64 where there is none.
func (l *leader) residualsOf(foreseen []rules.Num) []int64 {
	out := make([]int64, len(l.values))
	for m, u := range l.values {
		out[m] = Missing64
		if u == rules.Missing || m >= len(foreseen) || !foreseen[m].OK {
			continue
		}
		if f := math.Round(foreseen[m].V * float64(rules.One)); math.Abs(f) <= float64(rules.WindowLimit) {
			out[m] = int64(u) - int64(f)
		}
	}
	return out
}

// residualsOn gathers the residuals of a date, and notes those that differ from what the ledger holds.
func (w *worker) residualsOn(t task, d *day, old bool, fresh []int64, out *outcome) error {
	r := w.residuals
	if r == nil {
		return nil
	}
	now, before := r.now[:t.width], r.before[:t.width]
	fillMissing(before)
	if old {
		if err := w.view.Patch(w.j.residuals, d.date, t.block, t.from, before); err != nil {
			return err
		}
	}
	copy(now, before)
	for i, v := range fresh {
		if v != Missing64 {
			now[i] = Missing64
		}
	}
	w.foreseenNow(t, d.date, now)
	u := UsedColumn{Range: w.j.residuals, Date: d.date, Block: t.block}
	for i := range now {
		if r.fresh[i] = Missing64; fresh[i] != Missing64 || before[i] == Missing64 {
			r.fresh[i] = now[i]
		}
		if now[i] != before[i] {
			u.Offsets, u.Values = append(u.Offsets, uint16(t.from+i)), append(u.Values, now[i])
		}
	}
	if len(u.Offsets) > 0 {
		out.used = append(out.used, u)
	}
	return nil
}

// foreseenNow overlays residuals with those of a date that was weighed.
func (w *worker) foreseenNow(t task, date rules.Date, now []int64) {
	if w.j.weighed == nil || w.j.weighed.days[date] == nil || w.j.weighed.days[date].residuals == nil {
		return
	}
	from, to := w.j.weighed.crew.in(t)
	for m := from; m < to; m++ {
		now[w.memberAt(t, m)] = w.j.weighed.days[date].residuals[m]
	}
}

// values are what a lane judges of a date: all of them, and those judged now.
func (w *worker) values(t task, l *lane) (all, fresh []int64) {
	if l.residual {
		return w.residuals.now[:t.width], w.residuals.fresh[:t.width]
	}
	return w.raw[:t.width], w.fresh[:t.width]
}

// residualHit makes a hit of a candidate of a residual lane. A value that the file does not change may have its residual only now.
func (w *worker) residualHit(i int32) {
	if w.fresh[i] != Missing64 {
		w.hitAt(i, true)
		return
	}
	w.hitAt(i, false).woken = true
}

// withoutReference is the verdict of a residual range on a value that has no residual.
func (w *worker) withoutReference(i int) rules.Verdict {
	id, group := string(w.j.names.Name(w.task.series(i))), w.group(i)
	return rules.Verdict{Finding: rules.NotJudged, Why: WhyNoResidual(w.j.members.Reference(id, group))}
}

// spanResidual is why a value over several business days is not held against a reference.
func spanResidual(days int) string {
	return rules.Terms{Days: days}.Covers() + ": it has no residual, since a reference speaks of one; its own range judges it at its length"
}

// WhyNoResidual says why a value has no residual, and the cure, by the reference that its settings give it.
func WhyNoResidual(reference string) string {
	switch reference {
	case "":
		return "it has no reference; give it one in the register or its group"
	case rules.PeersReference:
		return "its peers say too little; judged once eight of its group report and explain a fifth of its variance"
	}
	return "its reference " + reference + " has no value for the date or explains too little; judged once it has one and explains a fifth of its variance"
}

// towards moves lines of residuals to where they lie for the return: what the reference foresees comes on top.
func towards(v rules.Verdict, foreseen float64) rules.Verdict {
	for _, n := range []*rules.Num{&v.WatchLow, &v.WatchHigh, &v.Low, &v.High} {
		if n.OK {
			n.V += foreseen
		}
	}
	return v
}

// judgeResidual makes the verdict of a residual lane.
func (w *worker) judgeResidual(l *lane, h *hit, date rules.Date) rules.Verdict {
	x := w.residuals.now[h.at]
	if x == Missing64 && h.days > 1 {
		return rules.Verdict{Finding: rules.NotJudged, Why: spanResidual(h.days)}
	}
	if x == Missing64 {
		return w.withoutReference(int(h.at))
	}
	past := l.past(int(h.at))
	past.DF = w.j.scales.learnt(l, h.group, date)
	v := l.gauge.Judge(rules.Units(x), past)
	if !l.judges(int(h.at)) {
		v.Finding = rules.NotJudged
	}
	return v
}

// tallyResiduals counts the verdicts of a residual lane: those of the values that the file changes.
func (w *worker) tallyResiduals(t task, k int, l *lane, fresh []int64, c *Counts) {
	now := w.residuals.fresh[:t.width]
	judged, without := 0, 0
	for i, v := range fresh {
		if v == Missing64 {
			now[i] = Missing64 // judged now, and counted when it came
			continue
		}
		if l.judges(i) {
			judged++
			if now[i] == Missing64 && w.slot[i] < 0 {
				without++
			}
		}
	}
	c.NotJudged += without
	c.Inside += judged - without - w.tallyHits(k, l, c) - w.tallyThin(l, now, c)
}
