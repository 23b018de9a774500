package watcher

import (
	"slices"

	"strayd/rules"
)

// date judges one date of a task and lets the windows take its used values. old says that the ledger held values on it before.
func (w *worker) date(t task, d *day, old bool, out *outcome) error {
	raw, fresh := w.raw[:t.width], w.fresh[:t.width]
	if d.col != nil {
		d.col.Fill(fresh, t.from, rules.Places)
	} else {
		fillMissing(fresh)
	}
	if err := w.merge(t, d, old, raw, fresh); err != nil {
		return err
	}
	if err := w.residualsOn(t, d, old, fresh, out); err != nil {
		return err
	}
	w.clearHits()
	if err := w.termsHits(t, d, old, fresh); err != nil {
		return err
	}
	if err := w.findHits(t, d, old, fresh, out); err != nil {
		return err
	}
	present := count(fresh)
	for n := range w.hits {
		w.judge(d.date, &w.hits[n])
	}
	if w.j.lone {
		if err := w.lone(t, d, old, out); err != nil {
			return err
		}
	}
	if w.count != nil {
		w.countDate(t, d.date)
	}
	w.tally(t, present, fresh, out)
	w.raise(t, d, fresh, out)
	for k, l := range w.lanes {
		if err := w.take(t, d, old, k, l, out); err != nil {
			return err
		}
	}
	return nil
}

// findHits finds the values of a date that are not plainly inside everything.
func (w *worker) findHits(t task, d *day, old bool, fresh []int64, out *outcome) error {
	for _, l := range w.lanes {
		all, now := w.values(t, l)
		l.rest(d.date, all)
		w.cand = l.candidates(now, w.cand[:0])
		for _, i := range w.cand {
			switch {
			case !l.judges(int(i)) || l.windows.N(int(i)) < rules.LeastJudged:
			case l.residual:
				w.residualHit(i)
			default:
				w.hitAt(i, true)
			}
		}
	}
	w.limitHits(fresh)
	if old {
		if err := w.markedHits(t, d, fresh); err != nil {
			return err
		}
		if err := w.outHits(t, d, fresh); err != nil {
			return err
		}
	}
	w.viewHits(t, d, fresh, out)
	w.decidedHits(t, d.date, fresh)
	if w.j.lone && d.col != nil {
		if err := w.loneHits(t, fresh); err != nil {
			return err
		}
	}
	return nil
}

func fillMissing(vals []int64) {
	for i := range vals {
		vals[i] = Missing64
	}
}

func count(vals []int64) (n int) {
	for _, v := range vals {
		if v != Missing64 {
			n++
		}
	}
	return n
}

// merge makes raw the values of the date: those held, overlaid by the fresh ones.
func (w *worker) merge(t task, d *day, old bool, raw, fresh []int64) error {
	if !old {
		copy(raw, fresh)
		return nil
	}
	ok, err := w.view.Fill(Returns, d.date, t.block, t.from, raw)
	if err != nil {
		return err
	}
	if !ok {
		fillMissing(raw)
	}
	for i, v := range fresh {
		if v != Missing64 {
			raw[i] = v
		}
	}
	return nil
}

func (w *worker) clearHits() {
	for _, h := range w.hits {
		w.slot[h.at] = -1
	}
	w.hits = w.hits[:0]
}

// hitAt is the hit of a series, made when it is not there yet.
func (w *worker) hitAt(i int32, fresh bool) *hit {
	if n := w.slot[i]; n >= 0 {
		return &w.hits[n]
	}
	w.slot[i] = int32(len(w.hits))
	if len(w.hits) < cap(w.hits) { // keep the old hit's slices for reuse
		w.hits = w.hits[:len(w.hits)+1]
	} else {
		w.hits = append(w.hits, hit{})
	}
	h := &w.hits[len(w.hits)-1]
	*h = hit{at: i, fresh: fresh, group: w.group(int(i)), verdicts: h.verdicts[:0], limits: h.limits[:0], broken: h.broken[:0]}
	return h
}

// limitHits finds the fresh values beyond a limit or beyond what may enter a window.
func (w *worker) limitHits(fresh []int64) {
	w.cand = oversize(fresh, w.cand[:0])
	for _, i := range w.cand {
		w.hitAt(i, true).outsize = true
	}
	for _, n := range w.j.limits {
		l := w.j.gauges[n].Range.Limit
		low, high := int64(l.Low), int64(l.High)
		for i, v := range fresh {
			if (v < low || v > high) && v != Missing64 && w.applies(n, i) {
				w.hitAt(int32(i), true)
			}
		}
	}
}

func (w *worker) applies(rangeIndex, i int) bool {
	if len(w.ids) == 0 {
		return true
	}
	return w.j.members.Applies(rangeIndex, w.ids[i], w.groups[i])
}

// judge makes every verdict of a hit.
func (w *worker) judge(date rules.Date, h *hit) {
	x := rules.Units(w.raw[h.at])
	for _, l := range w.lanes {
		if l.residual {
			v := w.judgeResidual(l, h, date)
			h.verdicts = append(h.verdicts, v)
			h.flagged = h.flagged || (h.fresh || h.woken) && v.Finding == rules.Breach
			continue
		}
		past := l.past(int(h.at))
		past.Days, past.DF = h.days, w.j.scales.learnt(l, h.group, date)
		if past.N < rules.LeastNormal && past.N >= rules.LeastJudged {
			past.Group = w.j.scales.lent(l, h.group, date)
		}
		v := l.gauge.Judge(x, past)
		if !l.judges(int(h.at)) { // its lines still say what its window takes of a flagged value, whoever is judged by it today
			v.Finding = rules.NotJudged
		}
		h.verdicts = append(h.verdicts, v)
		h.flagged = h.flagged || h.fresh && v.Finding == rules.Breach
	}
	for _, n := range w.j.limits {
		if !w.applies(n, int(h.at)) {
			continue
		}
		l := w.j.gauges[n].Range.Limit
		h.limits = append(h.limits, *l)
		if x < l.Low || x > l.High {
			h.broken = append(h.broken, n)
		}
	}
	h.flagged = h.flagged || h.fresh && (h.outsize || len(h.broken) > 0) || h.view != nil && h.view.Kind != ""
	h.flagged = h.flagged && (!h.taken || len(h.broken) > 0)
}

func (l *lane) judges(i int) bool { return l.applies == nil || l.applies[i] }

// tally counts the verdicts of a date. Values that are no hits are inside every range that judges them, but for those whose window
// holds too little to judge by.
func (w *worker) tally(t task, present int, fresh []int64, out *outcome) {
	if present == 0 {
		return
	}
	c := &out.counts
	for k, l := range w.lanes {
		if l.residual {
			w.tallyResiduals(t, k, l, fresh, c)
			continue
		}
		judged := present
		if l.applies != nil {
			judged = 0
			for i, v := range fresh {
				if v != Missing64 && l.applies[i] {
					judged++
				}
			}
		}
		c.Inside += judged - w.tallyHits(k, l, c) - w.tallyThin(l, fresh, c)
	}
}

// tallyThin counts the values of thin windows that are no hits, and says how many of them are not judged.
func (w *worker) tallyThin(l *lane, fresh []int64, c *Counts) (unjudged int) {
	if !l.thin {
		return 0
	}
	l.thin = false
	for i, v := range fresh {
		n := l.windows.N(i)
		if n >= rules.LeastNormal {
			continue
		}
		l.thin = true
		switch {
		case v == Missing64 || w.slot[i] >= 0 || !l.judges(i):
		case n < rules.LeastJudged:
			unjudged++
		default:
			c.Provisional++
		}
	}
	c.NotJudged += unjudged
	return unjudged
}

// tallyHits counts the hits of one lane and says how many of them are not inside.
func (w *worker) tallyHits(k int, l *lane, c *Counts) (other int) {
	for n := range w.hits {
		h := &w.hits[n]
		if !h.fresh || !l.judges(int(h.at)) {
			continue
		}
		v := &h.verdicts[k]
		if v.Provisional {
			c.Provisional++
		}
		switch v.Finding {
		case rules.Watch:
			c.Watch++
		case rules.Breach:
			c.Breach++
		case rules.NotJudged:
			c.NotJudged++
		default:
			continue
		}
		other++
	}
	return other
}

// take lets one lane's windows take the used values of a date, and notes where they differ from what is stored.
func (w *worker) take(t task, d *day, old bool, k int, l *lane, out *outcome) error {
	all, _ := w.values(t, l)
	used := all
	var stored []int64
	if old {
		stored = w.held[:t.width]
		copy(stored, all)
		if err := w.view.Patch(l.id, d.date, t.block, t.from, stored); err != nil {
			return err
		}
	}
	if len(w.hits) > 0 || w.hasOutsize(used) {
		used = l.used[:t.width]
		copy(used, all)
		for n := range w.hits {
			if h := &w.hits[n]; (h.flagged || h.out || h.days > 1 || h.decided != nil) && used[h.at] != Missing64 {
				used[h.at] = int64(h.used(l, k, rules.Units(used[h.at]), rules.Units(w.raw[h.at])))
			}
		}
		outsize(used)
	}
	w.patch(t, d, l, all, used, stored, out)
	if l.kept != nil {
		return w.pushKept(t, l, d.date, used)
	}
	l.push(d.date, used)
	return nil
}

// used is what a lane's window takes of a flagged value.
func (h *hit) used(l *lane, k int, x, raw rules.Units) rules.Units {
	if h.days > 1 { // whoever decides what of it: it is no daily value
		return rules.Missing
	}
	limits := h.limits
	if l.residual {
		limits = nil // they are about returns
	}
	if h.decided != nil && h.decided.Uses(raw) == rules.Missing {
		return rules.Missing
	} else if h.decided != nil {
		return x + h.decided.Uses(raw) - raw // of a residual: by as much as the return
	}
	if h.out && l.gauge.Range.Pending != rules.Keep {
		return rules.Missing
	}
	if !h.flagged {
		return x
	}
	x, ok := rules.UsedValue(l.gauge.Range.Pending, x, &h.verdicts[k], limits)
	if !ok {
		return rules.Missing
	}
	return x
}

func (w *worker) hasOutsize(vals []int64) bool {
	w.cand = oversize(vals, w.cand[:0])
	return len(w.cand) > 0
}

// patch notes the cells whose used value is not what the ledger would give: on a new date, what differs from the return.
func (w *worker) patch(t task, d *day, l *lane, all, used, stored []int64, out *outcome) {
	u := UsedColumn{Range: l.id, Date: d.date, Block: t.block}
	add := func(i int) {
		u.Offsets = append(u.Offsets, uint16(t.from+i))
		u.Values = append(u.Values, used[i])
	}
	if stored == nil {
		w.eachFlagged(func(i int) {
			if used[i] != all[i] && rules.InWindow(rules.Units(all[i])) {
				add(i)
			}
		})
	} else {
		outsize(stored)
		for i := range used {
			if used[i] != stored[i] {
				add(i)
			}
		}
	}
	if len(u.Offsets) > 0 {
		out.used = append(out.used, u)
	}
}

// eachFlagged calls f for the flagged hits in the order of the series.
func (w *worker) eachFlagged(f func(i int)) {
	var at []int
	for n := range w.hits {
		if h := &w.hits[n]; h.flagged || h.out || h.days > 1 {
			at = append(at, int(w.hits[n].at))
		}
	}
	slices.Sort(at)
	for _, i := range at {
		f(i)
	}
}
