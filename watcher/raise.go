package watcher

import (
	"fmt"
	"slices"

	"strayd/rules"
)

// raise makes the flags of the fresh hits and of the restated values of a date.
func (w *worker) raise(t task, d *day, fresh []int64, out *outcome) {
	if d.col != nil {
		w.countArrivals(t, d, fresh, out)
	}
	for n := range w.hits {
		h := &w.hits[n]
		if h.woken {
			w.raiseWoken(t, d, h, out)
		}
		if !h.fresh {
			continue
		}
		var raised []rules.Kind
		restated := d.restated(t, h)
		for _, f := range w.flagsOf(t, d, h) {
			w.fillView(f, d.date, h)
			w.keep(f, restated, out)
			raised = append(raised, f.Kind)
		}
		if !restated {
			continue
		}
		for _, kind := range rules.OutOfLine {
			if !slices.Contains(raised, kind) {
				w.amend(w.blank(t, d, int(h.at)), kind, out)
			}
		}
	}
}

// raiseWoken makes the flag of a value that is judged anew, or notes on the flags that it has what it looks like now.
func (w *worker) raiseWoken(t task, d *day, h *hit, out *outcome) {
	steps, err := w.stepsOf(t, d.date, []int{int(h.at)})
	if err != nil {
		w.failed = err
		return
	}
	about, err := aboutValue(w.view, t.series(int(h.at)), d.date, steps[0])
	if err != nil {
		w.failed = err
		return
	}
	for n := range about.flags {
		if f := about.flags[n]; h.view != nil && f.Kind != rules.KindRestated && f.Standing.Asks() {
			row := w.newFlag()
			row.Flag, row.SeriesID = f, t.series(int(h.at))
			relook(row, h.view, w.j.newest)
			out.flags = append(out.flags, row)
		}
	}
	if about.flagged || about.decided != nil {
		return
	}
	for _, f := range w.flagsOf(t, d, h) {
		if err := w.source(f, steps[0]); err != nil {
			w.failed = err
		}
		if f.First = w.j.weighed.reference(f.SeriesID) >= w.j.firstNames; f.First && f.Date < w.j.newest {
			f.Standing = rules.OfHistory
		}
		w.fillView(f, d.date, h)
		out.flags = append(out.flags, f)
	}
}

// source notes on a flag which file brought the version of its value that a step wrote.
func (w *worker) source(f *FlagRow, step uint32) error {
	row, err := w.view.File(step)
	if err != nil {
		return err
	}
	f.Feed, f.File = row.File.Feed, row.File.Name
	versions, err := w.view.Series(Returns, f.SeriesID)
	for _, v := range versions {
		if v.Date == f.Date && v.Step == step {
			f.Line = v.Line
		}
	}
	return err
}

// flagsOf makes the flags of a hit: breach and limit, or, where it is neither, what the pool finds doubtful.
func (w *worker) flagsOf(t task, d *day, h *hit) (flags []*FlagRow) {
	if k := worst(h.verdicts); k >= 0 && !h.taken {
		f := w.blank(t, d, int(h.at))
		w.fillBreach(f, k, h)
		flags = append(flags, f)
	}
	if len(h.broken) > 0 || h.outsize {
		f := w.blank(t, d, int(h.at))
		w.fillLimit(f, h)
		flags = append(flags, f)
	}
	if len(flags) == 0 && !h.taken && h.view != nil && h.view.Kind != "" {
		f := w.blank(t, d, int(h.at))
		w.fillDoubt(f, h)
		flags = append(flags, f)
	}
	return flags
}

func (d *day) restated(t task, h *hit) bool {
	return d.old != nil && d.old[t.from+int(h.at)] != Missing64
}

// keep notes a flag. One that a restated value had before is replaced under its ref, and reopened where it had been settled.
func (w *worker) keep(f *FlagRow, restated bool, out *outcome) {
	if restated {
		old, ok, err := w.view.FlagAt(f.SeriesID, f.Date, f.Kind)
		if err != nil {
			w.failed = err
		}
		if ok {
			f.Ref, f.RaisedAt, f.New, f.Standing = old.Ref, old.RaisedAt, false, old.Standing
			if f.Standing == rules.Acknowledged {
				f.Last = old.Last
			}
			if !f.Standing.Asks() {
				f.Standing = rules.Reopened
			}
		}
	}
	out.flags = append(out.flags, f)
}

// amend notes on the flag of a value that was restated that it would not be raised now. What it was raised for stands; what somebody
// settled of it was about the value before, so that it is open again.
func (w *worker) amend(f *FlagRow, kind rules.Kind, out *outcome) {
	old, ok, err := w.view.FlagAt(f.SeriesID, f.Date, kind)
	if err != nil {
		w.failed = err
	}
	if ok {
		reopens := old.Last != nil && !old.Standing.Asks()
		if reopens {
			old.Standing, old.Last, old.Decided = rules.Reopened, nil, nil
		}
		old.Note = "restated to " + rules.InPercent(f.Return.Float()) + ", for which it would not be raised"
		out.flags = append(out.flags, &FlagRow{Flag: old, SeriesID: f.SeriesID, Reopens: reopens})
	}
}

// countArrivals counts new, late and restated values, and flags the restated ones.
func (w *worker) countArrivals(t task, d *day, fresh []int64, out *outcome) {
	if d.old == nil && !w.behind {
		out.counts.New += count(fresh)
		return
	}
	for i, v := range fresh {
		if v == Missing64 {
			continue
		}
		switch {
		case d.old != nil && d.old[t.from+i] != Missing64:
			out.counts.Restated++
			f, old := w.blank(t, d, i), rules.Units(d.old[t.from+i])
			f.Kind, f.Note = rules.KindRestated, join(RestatedNote(old, f.Return), w.termsNote(t, d, i))
			w.keep(f, true, out)
		case w.late[i] > d.date:
			out.counts.Late++
		default:
			out.counts.New++
		}
	}
}

// worst is the lane whose breach has the smallest tail, -1 when none is breached.
func worst(verdicts []rules.Verdict) int {
	at := -1
	for k := range verdicts {
		if verdicts[k].Finding == rules.Breach && (at < 0 || verdicts[k].Log10.V < verdicts[at].Log10.V) {
			at = k
		}
	}
	return at
}

// blank is a flag with what every flag of an observation carries.
func (w *worker) blank(t task, d *day, i int) *FlagRow {
	id := t.series(i)
	f := w.newFlag()
	f.SeriesID, f.New = id, true
	f.RaisedAt, f.Date = w.j.now, d.date
	f.Series, f.Group = string(w.j.names.Name(id)), w.group(i)
	f.Return, f.Used, f.WindowTo = rules.Units(w.raw[i]), rules.Missing, rules.NoDate
	f.Feed, f.File = w.j.file.Feed, w.j.file.Name
	if d.col != nil {
		f.Line = d.col.Line(t.from + i)
	}
	f.Standing = rules.Open
	f.First = int(id) >= w.j.firstNames
	if f.First && d.date < w.j.newest {
		f.Standing = rules.OfHistory
	}
	return f
}

// newFlag is an empty flag; they are made by the piece, a page or so at a time.
func (w *worker) newFlag() *FlagRow {
	if len(w.flags) == 0 {
		w.flags = make([]FlagRow, 32)
	}
	f := &w.flags[0]
	w.flags = w.flags[1:]
	return f
}

func (w *worker) fillBreach(f *FlagRow, k int, h *hit) {
	f.Kind = rules.KindBreach
	w.fillLines(f, k, h)
}

// fillLines notes on a flag what a range expected.
func (w *worker) fillLines(f *FlagRow, k int, h *hit) {
	l, v := w.lanes[k], &h.verdicts[k]
	f.Range = l.gauge.Range.Name
	x := f.Return
	if l.residual {
		x = rules.Units(w.residuals.now[h.at])
		shifted := towards(*v, (f.Return - x).Float())
		v = &shifted
	}
	f.Low, f.High, f.Z, f.Tail, f.Log10 = v.Low, v.High, v.Z, v.Tail, v.Log10
	f.Note = v.Why
	f.Window, f.WindowTo = v.N, l.last[h.at]
	if f.Used = h.used(l, k, x, f.Return); f.Used != rules.Missing {
		f.Used += f.Return - x // of a residual: with what the reference foresees
	}
}

func (w *worker) fillLimit(f *FlagRow, h *hit) {
	f.Kind = rules.KindLimit
	if len(h.broken) == 0 {
		f.Note = fmt.Sprintf("beyond +-%d, never enters a window", rules.WindowLimit/rules.One)
		return
	}
	r := w.j.gauges[h.broken[0]].Range
	f.Range = r.Name
	f.Low, f.High = rules.Some(r.Limit.Low.Float()), rules.Some(r.Limit.High.Float())
}

// RestatedNote says by how much a value changed: "changed by +12.3 bp from +0.12 %". The versions have it exactly.
func RestatedNote(old, now rules.Units) string {
	return fmt.Sprintf("changed by %s bp from %s", SignedBP(old, now), rules.InPercent(old.Float()))
}

// SignedBP is the exact change from one return to another in basis points, with its sign.
func SignedBP(old, now rules.Units) string {
	bp := rules.Decimal(int64(now-old), rules.Places-4)
	if now >= old {
		return "+" + bp
	}
	return bp
}
