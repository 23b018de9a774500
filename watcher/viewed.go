package watcher

import (
	"fmt"
	"math"
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// viewHits makes hits of the values of a date that the pool has a view of, and settles what it now says of the date before.
func (w *worker) viewHits(t task, d *day, fresh []int64, out *outcome) {
	if w.j.weighed == nil {
		return
	}
	from, to := w.j.weighed.crew.in(t)
	w.leftOut(t, d.date, from, to, fresh)
	said := w.j.weighed.days[d.date]
	if said == nil {
		return
	}
	for n := range said.Views {
		v := &said.Views[n]
		if v.Member < from || v.Member >= to {
			continue
		}
		switch at := w.memberAt(t, v.Member); {
		case said.woken != nil && said.woken[v.Member]:
			h := w.hitAt(at, false)
			h.view, h.woken = v, true
		case said.fresh[v.Member] && (v.Kind != "" || w.slot[at] >= 0):
			w.hitAt(at, true).view = v
		}
	}
	for n := range said.Earlier {
		e := &said.Earlier[n]
		if e.Member >= from && e.Member < to && w.settleEarlier(w.j.weighed.crew.series[e.Member], e, d.date, out) && said.fresh[e.Member] {
			if h := w.hitAt(w.memberAt(t, e.Member), true); h.out {
				h.taken = true
			}
		}
	}
}

// leftOut makes hits of the fresh values of a date that the pool leaves out.
func (w *worker) leftOut(t task, date rules.Date, from, to int, fresh []int64) {
	uses := w.j.weighed.uses[date]
	if len(uses) == 0 {
		return
	}
	for m := from; m < to; m++ {
		if at := w.memberAt(t, m); uses[m] == causes.Out && fresh[at] != Missing64 {
			w.hitAt(at, true).out = true
		}
	}
}

// memberAt is the place in the task of the series that is a member.
func (w *worker) memberAt(t task, member int) int32 {
	return int32(w.j.weighed.crew.series[member] - t.series(0))
}

// outHits finds the values held before that the pool left out, or leaves out now.
func (w *worker) outHits(t task, d *day, fresh []int64) error {
	if w.j.concluded == 0 {
		return nil
	}
	uses := w.held[:t.width]
	clear(uses)
	if err := w.view.Patch(w.j.concluded, d.date, t.block, t.from, uses); err != nil {
		return err
	}
	w.usesNow(t, d.date, uses)
	for i, u := range uses {
		if causes.Use(u) == causes.Out && fresh[i] == Missing64 && w.raw[i] != Missing64 {
			w.hitAt(int32(i), false).out = true
		}
	}
	return nil
}

// usesNow overlays what the pool concluded before with what it concludes now.
func (w *worker) usesNow(t task, date rules.Date, uses []int64) {
	if w.j.weighed == nil || len(w.j.weighed.uses[date]) == 0 {
		return
	}
	from, to := w.j.weighed.crew.in(t)
	for m := from; m < to; m++ {
		if u, ok := w.j.weighed.uses[date][m]; ok {
			uses[w.memberAt(t, m)] = int64(u)
		}
	}
}

// noteReference notes on the flag of a value that the pool has no view of what its reference leaves unexplained, where that is kept.
func (w *worker) noteReference(f *FlagRow, h *hit) {
	if w.residuals == nil || w.residuals.now[h.at] == Missing64 {
		return
	}
	group := w.group(int(h.at))
	f.Reference, f.Residual = w.j.members.Reference(f.Series, group), rules.Some(rules.Units(w.residuals.now[h.at]).Float())
}

// explained says that a breach under a range of returns is the move of the reference: what the reference leaves of it is ordinary, and what
// it foresees lies beyond the inner line by itself.
func explained(f *FlagRow, v *causes.View, lines *rules.Lines) bool {
	if f.Kind != rules.KindBreach || v == nil || !v.Residual.OK || math.Abs(v.Z) > ordinaryZ || v.LooksLike != "" && v.LooksLike != rules.CauseGenuine {
		return false
	}
	foreseen := f.Return.Float() - v.Residual.V
	return lines.WatchLow.OK && foreseen < lines.WatchLow.V || lines.WatchHigh.OK && foreseen > lines.WatchHigh.V
}

// ordinaryZ is the watch line of 1 % under a t5 scaled to unit variance.
const ordinaryZ = 3.123

// fillView is the package's, with a word on a reference that its followers agree is wrong.
func (w *worker) fillView(f *FlagRow, date rules.Date, h *hit) {
	v := h.view
	if v == nil {
		w.noteReference(f, h)
		return
	}
	fillView(f, v)
	for k, l := range w.lanes {
		if l.gauge.Range.Name == f.Range && !l.residual && explained(f, v, &h.verdicts[k].Lines) {
			f.LooksLike, f.Share, f.Implied = rules.CauseMarket, rules.Num{}, rules.Num{}
		}
	}
	if v.Member < 0 { // a lone series
		return
	}
	if n := w.j.weighed.days[date].followers(v.Member); n > 0 {
		note := rules.Counted(n, "series") + " held against it agree that it is wrong"
		if f.Kind == rules.KindBreach && f.Note != "" {
			note = f.Note + "; " + note
		}
		f.Note = note
	}
}

// fillView notes on a flag what the value looks like and what its reference says.
func fillView(f *FlagRow, v *causes.View) {
	if v == nil {
		return
	}
	f.LooksLike, f.Share, f.Implied = v.LooksLike, rules.Num{}, rules.Num{}
	if v.LooksLike != "" {
		f.Share, f.Implied = rules.Num{V: v.Share, OK: v.Share > 0}, v.Implied
	}
	f.Reference, f.ReferenceReturn, f.Residual = v.Reference, v.ReferenceReturn, v.Residual
}

// fillDoubt makes a flag of a value inside its line. The range that it lies farthest out in says what was expected.
func (w *worker) fillDoubt(f *FlagRow, h *hit) {
	f.Kind = h.view.Kind
	f.Note = fmt.Sprintf("odds of an error %s, doubt begins at %s", rules.Odds(h.view.LogOdds), rules.Odds(h.view.Line))
	farthest := -1
	for k := range h.verdicts {
		v := &h.verdicts[k]
		if v.Tail.OK && v.Finding != rules.NotJudged && (farthest < 0 || v.Log10.V < h.verdicts[farthest].Log10.V) {
			farthest = k
		}
	}
	if farthest < 0 {
		return
	}
	note := f.Note
	w.fillLines(f, farthest, h)
	f.Note = note
}

// settleEarlier notes on the flag of the date before what it looks like now, and keeps what it looked like. It says whether there is
// such a flag.
func (w *worker) settleEarlier(series uint32, v *causes.View, now rules.Date, out *outcome) (found bool) {
	var flags []*FlagRow
	for n := len(out.flags) - 1; n >= 0 && out.flags[n].Date >= v.Date; n-- {
		if f := out.flags[n]; f.Date == v.Date && f.SeriesID == series && slices.Contains(rules.OutOfLine, f.Kind) {
			flags = append(flags, f)
		}
	}
	for _, kind := range rules.OutOfLine {
		if len(flags) > 0 {
			break
		}
		f, ok, err := w.view.FlagAt(series, v.Date, kind)
		if err != nil {
			w.failed = err
		}
		if ok {
			row := w.newFlag()
			row.Flag, row.SeriesID = f, series
			flags = append(flags, row)
			out.flags = append(out.flags, row)
		}
	}
	for _, f := range flags {
		if f.Standing.Asks() || f.Standing == rules.OfHistory {
			relook(f, v, now)
		}
	}
	return len(flags) > 0
}

// relook gives a flag another cause and notes the one that it had.
func relook(f *FlagRow, v *causes.View, now rules.Date) {
	if f.LooksLike == v.LooksLike {
		fillView(f, v)
		return
	}
	before := "nothing in particular"
	if f.LooksLike != "" {
		before = fmt.Sprintf("%s (%.0f %%)", f.LooksLike, 100*f.Share.V)
	}
	note := fmt.Sprintf("looked like %s until %s", before, now)
	if f.Note != "" {
		note = f.Note + "; " + note
	}
	fillView(f, v)
	f.Note = note
}
