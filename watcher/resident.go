package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/stats"
)

// Resident keeps the names and the sums of plain windows between the passes of one process, so that a pass over one new date need not
// read the windows again. It is right for one step of the ledger only, and forgets everything when it meets another: what it keeps is
// never more than a short cut. The zero value is ready. It serves one pass at a time.
type Resident struct {
	step  uint32 // of the ledger that all below belongs to; 0 while a step is under way
	names *Names
	width int // of the widest task
	kept  map[keptKey]*kept
}

type keptKey struct {
	id    uint16 // of the range
	block uint32
	from  int
}

// kept is one lane's state for the series of one task.
type kept struct {
	slide   *stats.Slide
	last    []rules.Date
	dormant []bool
	thin    bool
	dates   []rules.Date // in the windows of the series that are not apart, oldest first
}

// mostApart is the greatest share of a task's series that may be apart, one in so many: for more, reading the window anew is no slower.
const mostApart = 4

// mostLost is how many series of a task may fall apart on one date and be read one by one.
const mostLost = 64

// begin readies what is kept for a pass that goes on from a step. Until end is called for the next one, nothing counts as kept.
func (r *Resident) begin(step uint32, width int) map[keptKey]*kept {
	if r.step != step || r.width != width || r.kept == nil {
		r.kept = map[keptKey]*kept{}
	}
	r.step, r.width = 0, width
	return r.kept
}

// end takes what a step that was published leaves to be kept.
func (r *Resident) end(step uint32, tasks []keptTask) {
	if r == nil {
		return
	}
	r.step = step
	for _, t := range tasks {
		if t.kept == nil {
			delete(r.kept, t.key)
			continue
		}
		r.kept[t.key] = t.kept
	}
}

// passed says that a step was published that changed no observation.
func (r *Resident) passed(step uint32) {
	if r != nil && r.step == step-1 {
		r.step = step
	}
}

// lend gives out the names held at a step, nil when they are not kept. A pass that ends well gives them back; one that does not may
// have added to them.
func (r *Resident) lend(step uint32) (names *Names) {
	if r == nil {
		return nil
	}
	if r.step == step {
		names = r.names
	}
	r.names = nil
	return names
}

func (r *Resident) giveBack(names *Names) {
	if r != nil {
		r.names = names
	}
}

// resume gives a lane the state that was kept for a task of one new date. It is false when there is none.
func (w *worker) resume(t task, l *lane) bool {
	if l.residual || len(t.days) != 1 || w.behind || t.since != rules.NoDate {
		return false
	}
	k := w.j.kept[keptKey{l.id, t.block, t.from}]
	if k == nil || len(k.last) != t.width {
		return false
	}
	l.kept, l.spoilt = k, false
	l.windows, l.last, l.dormant, l.thin = k.slide, k.last, k.dormant, k.thin
	return true
}

// pushKept moves a resumed lane on by the row of a date. Series that fall apart on it get the values that their windows hold.
func (w *worker) pushKept(t task, l *lane, date rules.Date, used []int64) error {
	k, window := l.kept, l.gauge.Range.Window
	if count(used) == 0 { // a date of other series
		return nil
	}
	var leaving []int64
	if len(k.dates) == window {
		leaving = l.leaving[:t.width]
		if err := w.usedOn(t, l, k.dates[0], leaving); err != nil {
			return err
		}
	}
	lost := k.slide.Push(used, leaving)
	l.note(date, used)
	if l.spoilt = k.slide.Apart()+len(lost) > t.width/mostApart || len(lost) > mostLost; l.spoilt {
		return nil
	}
	for _, i := range lost {
		values, err := w.windowOf(t, l, int(i))
		if err != nil {
			return err
		}
		k.slide.Set(int(i), values)
	}
	if k.dates = append(k.dates, date); len(k.dates) > window {
		k.dates = k.dates[1:]
	}
	return nil
}

// windowOf reads the values of a series that had one on each of the dates kept.
func (w *worker) windowOf(t task, l *lane, i int) ([]int64, error) {
	t.from, t.width = t.from+i, 1
	values := make([]int64, len(l.kept.dates), l.gauge.Range.Window)
	for n, date := range l.kept.dates {
		if err := w.usedOn(t, l, date, values[n:n+1]); err != nil {
			return nil, err
		}
	}
	return values, nil
}

// usedOn reads the used values of a date that is held.
func (w *worker) usedOn(t task, l *lane, date rules.Date, dst []int64) error {
	if ok, err := w.view.Fill(Returns, date, t.block, t.from, dst); err != nil || !ok {
		fillMissing(dst)
		return err
	}
	if err := w.view.Patch(l.id, date, t.block, t.from, dst); err != nil {
		return err
	}
	if !whole(dst) {
		outsize(dst)
	}
	return nil
}

// leave notes the lanes' states after a task for the next pass.
func (w *worker) leave(t task) {
	if w.j.kept == nil {
		return
	}
	for _, l := range w.lanes {
		k := l.kept
		panel, plain := l.windows.(*stats.Panel)
		switch {
		case k != nil && l.spoilt:
			k = nil
		case k != nil:
			k.thin = l.thin
		case plain && !w.replayed && !l.residual:
			k = l.keepNew(t.width, panel)
		}
		w.keptNow = append(w.keptNow, keptTask{keptKey{l.id, t.block, t.from}, k})
	}
}

// keepNew is a lane's state to be kept; nil where too many of its series are apart.
func (l *lane) keepNew(width int, panel *stats.Panel) *kept {
	together := min(len(l.dates), l.gauge.Range.Window)
	s := panel.Slide(width, func(i int) bool { return int(l.streak[i]) >= together && panel.N(i) == together })
	if s.Apart() > width/mostApart {
		return nil
	}
	dates := slices.Clone(l.dates[len(l.dates)-together:])
	return &kept{slide: s, last: slices.Clone(l.last[:width]), dormant: slices.Clone(l.dormant[:width]), thin: l.thin, dates: dates}
}

// keptTask is what a worker has to keep for one task; nil when there is nothing any more.
type keptTask struct {
	key  keptKey
	kept *kept
}
