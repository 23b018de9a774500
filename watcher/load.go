package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/stats"
)

// load brings every lane to its state before a date. A range whose state is a function of its last observations is filled from
// the newest date backwards; the weighted one goes forward from its newest stored state, or from the start.
func (w *worker) load(t task, before rules.Date) (err error) {
	held := w.j.heldBefore(t.block, before)
	loading := 0
	var back []*backward
	for _, l := range w.lanes {
		if w.resume(t, l) {
			continue
		}
		l.reset()
		if len(held) == 0 {
			continue
		}
		loading++
		if p, ok := l.windows.(loader); ok {
			back = append(back, newBackward(l, p, before, t.width))
		} else if err := w.loadForward(t, l, held, before); err != nil {
			return err
		}
	}
	if loading == 0 {
		return nil
	}
	if err := w.loadBack(t, back, held); err != nil {
		return err
	}
	return w.markDormant(t, before)
}

// loadBack fills lanes from the newest date backwards until all are full.
func (w *worker) loadBack(t task, back []*backward, held []rules.Date) error {
	for _, b := range back {
		defer func() { slices.Reverse(b.l.dates) }()
	}
	for i := len(held) - 1; i >= 0 && len(back) > 0; i-- {
		ok, err := w.view.Fill(Returns, held[i], t.block, t.from, w.raw[:t.width])
		if err != nil {
			return err
		}
		if !ok {
			continue
		}
		var open []*backward
		for _, b := range back {
			if err := w.stepBack(t, b, held[i]); err != nil {
				return err
			}
			if b.open > 0 {
				open = append(open, b)
			}
		}
		back = open
	}
	return nil
}

// usedOf is the used values of a lane on a date whose returns stand in raw; it takes raw over where no other lane needs it.
func (w *worker) usedOf(t task, l *lane, date rules.Date) ([]int64, error) {
	used := w.raw[:t.width]
	if len(w.lanes) > 1 {
		used = l.used[:t.width]
		copy(used, w.raw)
	}
	if l.residual {
		fillMissing(used)
		if err := w.view.Patch(w.j.residuals, date, t.block, t.from, used); err != nil {
			return nil, err
		}
	}
	if err := w.view.Patch(l.id, date, t.block, t.from, used); err != nil {
		return nil, err
	}
	if !whole(used) {
		outsize(used)
	}
	return used, nil
}

func (w *worker) loadForward(t task, l *lane, held []rules.Date, before rules.Date) error {
	state, err := w.view.State(l.id, t.block)
	if err != nil {
		return err
	}
	if state != nil && state.Upto < before && l.restore(state, t.from, t.width) {
		for len(held) > 0 && held[0] <= state.Upto {
			held = held[1:]
		}
	}
	for _, date := range held {
		ok, err := w.view.Fill(Returns, date, t.block, t.from, w.raw[:t.width])
		if err != nil {
			return err
		}
		if !ok {
			continue
		}
		used, err := w.usedOf(t, l, date)
		if err != nil {
			return err
		}
		l.rest(date, used)
		l.push(date, used)
	}
	return nil
}

// backward fills one lane from the newest date to older ones. A series is done when its window is full, or when the next older
// value would lie beyond a gap that made it dormant.
type backward struct {
	l     *lane
	into  loader
	later []rules.Date // the oldest used date found so far; the date at hand where none is found yet
	even  rules.Date   // that of every series, while they all have the same and none is done; else NoDate
	done  []bool
	open  int
	steps int
}

func newBackward(l *lane, into loader, before rules.Date, width int) *backward {
	b := &backward{l: l, into: into, later: make([]rules.Date, width), done: make([]bool, width), open: width, even: before}
	return b
}

func (b *backward) finish(i int) {
	b.done[i] = true
	b.open--
}

func (w *worker) stepBack(t task, b *backward, date rules.Date) error {
	used, err := w.usedOf(t, b.l, date)
	if err == nil {
		b.take(date, used)
	}
	return err
}

// take puts the used values of a date in front of the windows that are not done.
func (b *backward) take(date rules.Date, used []int64) {
	if b.l.tracked {
		b.l.trackBack(date, used)
	}
	if b.even == rules.NoDate || !b.takeEven(date, used) {
		b.takeEach(date, used)
	}
	b.into.Prepend(used)
	if b.steps++; b.steps >= b.l.gauge.Range.Window && b.steps%8 == 0 || b.steps == b.l.gauge.Range.Window {
		b.finishFull()
	}
}

// takeEven notes a date on which every series has a value, where all stand alike and the gap makes none dormant. When it is not so, it
// writes out how the series stand and is false.
func (b *backward) takeEven(date rules.Date, used []int64) bool {
	if b.even-date > dormantDays || !whole(used) {
		for i := range b.later {
			b.later[i] = b.even
		}
		b.even = rules.NoDate
		return false
	}
	if b.steps == 0 {
		for i := range used {
			b.l.last[i] = date
		}
	}
	b.even = date
	return true
}

// takeEach notes a date series by series, and takes out the values that a window must not have.
func (b *backward) takeEach(date rules.Date, used []int64) {
	edge := date + dormantDays
	last := b.l.last
	for i, v := range used {
		switch {
		case b.done[i]:
			used[i] = Missing64
		case b.later[i] > edge && b.l.between(i, date, b.later[i]) > rules.DormantAfter:
			b.finish(i)
			used[i] = Missing64
		case v != Missing64:
			b.later[i] = date
			if last[i] == rules.NoDate {
				last[i] = date
			}
		}
	}
}

func (b *backward) finishFull() {
	for i := range b.done {
		if !b.done[i] && b.into.Full(i) {
			b.finish(i)
		}
	}
}

// markDormant marks the series that have been seen before and yet have nothing within reach of the date.
func (w *worker) markDormant(t task, before rules.Date) error {
	for i := range t.width {
		id := t.series(i)
		if int(id) >= w.j.heldNames {
			return nil
		}
		dormant := w.late[i] == rules.NoDate
		if !dormant { // it has later values: only its whole history can tell a gap from a start
			versions, err := w.view.Series(Returns, id)
			if err != nil {
				return err
			}
			dormant = len(versions) > 0 && versions[0].Date < before
		}
		for _, l := range w.lanes {
			if l.kept == nil {
				l.dormant[i] = dormant && !l.residual && l.windows.N(i) == 0
			}
		}
	}
	return nil
}

// restore takes a lane's state from the stored one; false when its shape does not fit.
func (l *lane) restore(s *State, from, width int) bool {
	weighted, ok := l.windows.(*stats.WeightedPanel)
	if !ok || len(s.N) != len(s.Var) || len(s.N) != len(s.Last) || len(s.Sq) != len(s.N) {
		return false
	}
	for i := range width {
		if at := from + i; at < len(s.N) {
			q := stats.Uint128{Hi: s.Sq[at].Hi, Lo: s.Sq[at].Lo}
			weighted.SetState(i, stats.Weighted{N: int32(s.N[at]), V: s.Var[at], Q: q})
			l.last[i] = s.Last[at]
		}
	}
	return true
}
