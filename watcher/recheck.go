package watcher

import (
	"fmt"
	"slices"

	"strayd/rules"
)

// Recheck recomputes every rolling state and every used value from the returns held, under the settings recorded last, and
// compares them with what is stored. The error names the first that differs.
func Recheck(v View, progress Progress) error {
	last, recorded, err := lastSettings(v)
	if err != nil || last == 0 {
		return err
	}
	names, err := v.Names()
	if err != nil {
		return err
	}
	p := &Pass{Settings: *recorded}
	j := &judging{names: names, heldNames: names.Len(), firstNames: names.Len(), step: v.Step() + 1}
	if err := p.prepare(j, v); err != nil || len(j.held) == 0 {
		return err
	}
	j.scales = newGroupScales(j, v, nil)
	w := newWorker(j, v)
	todo := tasks(allBlocks(names.Len(), j.held[0]), j.width)
	for n, t := range todo {
		if err := w.recheck(t); err != nil {
			return err
		}
		if progress != nil {
			progress(int64(n+1), int64(len(todo)))
		}
	}
	return nil
}

// recheck replays one task from the first date, holding each stored state against the replay when its date is reached.
func (w *worker) recheck(t task) error {
	w.stored = w.stored[:0]
	for _, l := range w.lanes {
		s, err := w.view.State(l.id, t.block)
		if err != nil {
			return err
		}
		w.stored = append(w.stored, s)
	}
	out, err := w.run(t)
	if err != nil {
		return err
	}
	for _, u := range out.used {
		name := w.j.names.Name(u.Block*BlockSize + uint32(u.Offsets[0]))
		return fmt.Errorf("the used value of series %q on %s differs from its recomputation, %s", name, u.Date, rules.Units(u.Values[0]))
	}
	return nil
}

// compareStates holds the stored states of a date against the lanes.
func (w *worker) compareStates(t task, date rules.Date) error {
	for k, s := range w.stored {
		if s == nil || s.Upto != date {
			continue
		}
		if i := differs(s, w.lanes[k].state(t, date)); i >= 0 {
			return fmt.Errorf("the rolling state of range %q for series %q after %s differs from its recomputation",
				w.lanes[k].gauge.Range.Name, w.j.names.Name(t.series(i)), date)
		}
	}
	return nil
}

// differs is the first series of a task whose stored state is not the recomputed one, -1 when there is none. A series that came
// after the state was stored has none.
func differs(s *State, now partState) int {
	for i := range now.N {
		at := now.from + i
		if at >= len(s.N) {
			return -1
		}
		if s.N[at] != now.N[i] || s.Last[at] != now.Last[i] || s.Sum[at] != now.Sum[i] || s.Sq[at] != now.Sq[i] ||
			slices.Compare(tail(s.Var, at), tail(now.Var, i)) != 0 {
			return i
		}
	}
	return -1
}

// tail is the one value at an index, nothing where there is none.
func tail(v []float64, at int) []float64 {
	if at >= len(v) {
		return nil
	}
	return v[at : at+1]
}
