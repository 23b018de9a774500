package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

const (
	// lonePast is how many dates before a value of a lone series say what it looks like.
	lonePast = 120
	// naturalCopies is how many zeros or repeats among them make another one ordinary without being weighed.
	naturalCopies = 2
)

// pastRows are the returns of a task's series on the newest dates before the one at hand, as received: what was left out counts too, or a
// series whose zeros are a habit would never be known for it; but not those that cover several business days. Those of dates that the task did not go through are read when they are first
// needed.
type pastRows struct {
	first  rules.Date // of the task
	loaded bool       // what lies before it is there as far as it is needed
	rows   [][]int64  // by date, oldest first
	spare  [][]int64
	prev   []int64    // as received, of the date before; nil until it is known
	on     rules.Date // that date, NoDate where there is none
	weigh  *causes.Lone
	column []rules.Units // of one series
	codes  []int64       // what the ledger holds of how the values of a date are taken
}

// beginPast forgets the task before.
func (w *worker) beginPast(first rules.Date) {
	p := &w.past
	p.spare = append(p.spare, p.rows...)
	p.first, p.loaded, p.rows, p.prev = first, false, p.rows[:0], nil
}

// lonely says that a series is weighed by nothing but its own past.
func (w *worker) lonely(t task, i int) bool {
	if w.j.crew == nil {
		return true
	}
	_, member := w.j.crew.at[t.series(i)]
	return !member
}

// loneHits finds the fresh values of lone series that are zero or the value of the date before again, where neither is usual.
func (w *worker) loneHits(t task, fresh []int64) error {
	if w.past.prev == nil {
		if err := w.readPrev(t); err != nil {
			return err
		}
	}
	w.cand = w.cand[:0]
	for i, v := range fresh {
		if (v == 0 || v == w.past.prev[i]) && v != Missing64 && w.slot[i] < 0 {
			w.cand = append(w.cand, int32(i))
		}
	}
	if len(w.cand) == 0 {
		return nil
	}
	if err := w.readPast(t); err != nil {
		return err
	}
	for _, i := range w.cand {
		if w.lonely(t, int(i)) && w.past.unusual(int(i), fresh[i]) {
			w.hitAt(i, true)
		}
	}
	return nil
}

// unusual says that a zero, or a repeat, is no habit of a series.
func (p *pastRows) unusual(i int, v int64) bool {
	copies, seen, last := 0, 0, int64(Missing64)
	for _, row := range p.rows {
		x := row[i]
		if x == Missing64 {
			continue
		}
		if seen++; v == 0 && x == 0 || v != 0 && x == last {
			copies++
		}
		last = x
	}
	return copies < naturalCopies && seen >= rules.LeastNormal
}

// readPrev reads the returns of the newest date before the task.
func (w *worker) readPrev(t task) error {
	w.past.prev = w.past.row(t.width)
	fillMissing(w.past.prev)
	w.past.on = rules.NoDate
	for _, d := range slices.Backward(w.j.heldBefore(t.block, w.past.first)) {
		if ok, err := w.view.Fill(Returns, d, t.block, t.from, w.past.prev); ok || err != nil {
			w.past.on = d
			return err
		}
	}
	return nil
}

// readPast reads the dates before the task that are still needed.
func (w *worker) readPast(t task) error {
	p := &w.past
	if p.loaded {
		return nil
	}
	p.loaded = true
	var older [][]int64
	for _, d := range slices.Backward(w.j.heldBefore(t.block, p.first)) {
		if len(older)+len(p.rows) >= lonePast {
			break
		}
		row := p.row(t.width)
		ok, err := w.view.Fill(Returns, d, t.block, t.from, row)
		if err != nil {
			return err
		}
		if !ok {
			p.spare = append(p.spare, row)
			continue
		}
		if err := w.j.withoutSpans(w.view, d, t.block, t.from, row); err != nil {
			return err
		}
		older = append(older, row)
	}
	slices.Reverse(older)
	p.rows = append(older, p.rows...)
	return nil
}

func (p *pastRows) roomForCodes(width int) []int64 {
	if len(p.codes) < width {
		p.codes = make([]int64, width)
	}
	clear(p.codes[:width])
	return p.codes[:width]
}

// row is room for the returns of a date.
func (p *pastRows) row(width int) []int64 {
	if n := len(p.spare); n > 0 && cap(p.spare[n-1]) >= width {
		row := p.spare[n-1][:width]
		p.spare = p.spare[:n-1]
		return row
	}
	return make([]int64, width)
}

// passPast takes the date at hand into the past.
func (w *worker) passPast(t task, date rules.Date) {
	p, raw := &w.past, w.raw[:t.width]
	p.on = date
	if p.prev == nil {
		p.prev = p.row(t.width)
	}
	copy(p.prev, raw)
	var row []int64
	if len(p.rows) == lonePast {
		row = p.rows[0]
		p.rows = append(p.rows[:0], p.rows[1:]...)
	} else {
		row = p.row(t.width)
	}
	copy(row, raw)
	for n := range w.hits {
		if w.hits[n].days > 1 {
			row[w.hits[n].at] = Missing64
		}
	}
	p.rows = append(p.rows, row)
}

// weighLone says what a value of a lone series looks like: one that is flagged, or zero or a repeat.
func (w *worker) weighLone(t task, d *day, h *hit, out *outcome) error {
	if !h.fresh || h.days > 1 || h.view != nil || !w.lonely(t, int(h.at)) || !(h.flagged || w.raw[h.at] == 0 || w.raw[h.at] == w.past.prev[h.at]) {
		return nil
	}
	if err := w.readPast(t); err != nil {
		return err
	}
	p := &w.past
	if p.weigh == nil {
		p.weigh = causes.NewLone()
	}
	p.column = p.column[:0]
	for _, row := range p.rows {
		p.column = append(p.column, rules.Units(row[h.at]))
	}
	v, earlier := p.weigh.Weigh(p.column, rules.Units(p.prev[h.at]), d.date, rules.Units(w.raw[h.at]))
	v.Member = -1
	if !w.j.doubts {
		v.Kind = ""
	}
	h.flagged = h.flagged || v.Kind != ""
	h.view = &v
	h.out = use(&v) == causes.Out && h.flagged && w.j.doubts // nothing is left out in silence, nor where nobody is to doubt
	if earlier && h.out {
		before := v
		before.Date = p.on
		h.taken = w.settleEarlier(t.series(int(h.at)), &before, d.date, out)
		h.flagged = h.flagged && (!h.taken || len(h.broken) > 0)
	}
	return nil
}

// concludeLone notes which values of lone series are left out, where the ledger does not say so already.
func (w *worker) concludeLone(t task, d *day, old bool, out *outcome) error {
	codes := w.past.roomForCodes(t.width)
	if old {
		if err := w.view.Patch(w.j.concluded, d.date, t.block, t.from, codes); err != nil {
			return err
		}
	} else if len(w.hits) == 0 {
		return nil
	}
	u := UsedColumn{Range: w.j.concluded, Date: d.date, Block: t.block}
	for i, v := range w.fresh[:t.width] {
		if v == Missing64 || codes[i] == 0 && w.slot[i] < 0 || !w.lonely(t, i) {
			continue
		}
		now := causes.AsIs
		if n := w.slot[i]; n >= 0 && w.hits[n].out {
			now = causes.Out
		}
		if int64(now) != codes[i] {
			u.Offsets, u.Values = append(u.Offsets, uint16(t.from+i)), append(u.Values, int64(now))
		}
	}
	if len(u.Offsets) > 0 {
		out.used = append(out.used, u)
	}
	return nil
}

// lone weighs the values of lone series on a date, and takes the date into their past.
func (w *worker) lone(t task, d *day, old bool, out *outcome) error {
	if d.col != nil {
		for n := range w.hits {
			if err := w.weighLone(t, d, &w.hits[n], out); err != nil {
				return err
			}
		}
		if err := w.concludeLone(t, d, old, out); err != nil {
			return err
		}
	}
	w.passPast(t, d.date)
	return nil
}
