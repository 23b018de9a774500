package watcher

import (
	"strayd/rules"
)

// markedHits finds the values of a date held before that were flagged or decided as they stand. What is said of one version is not said
// of the next: a value that comes anew is judged for itself.
func (w *worker) markedHits(t task, d *day, fresh []int64) error {
	marked, err := w.view.Marked(d.date, t.block)
	if err != nil {
		return err
	}
	var held []int // offsets in the task of marked values that do not come anew
	for _, off := range marked {
		switch i := off - t.from; {
		case i < 0 || i >= t.width || w.raw[i] == Missing64:
		case fresh[i] != Missing64:
			w.hitAt(int32(i), true)
		default:
			held = append(held, i)
		}
	}
	if len(held) == 0 {
		return nil
	}
	steps, err := w.stepsOf(t, d.date, held)
	if err != nil {
		return err
	}
	for n, i := range held {
		about, err := aboutValue(w.view, t.series(i), d.date, steps[n])
		if err != nil {
			return err
		}
		if a := w.j.decided[valueAt{t.series(i), d.date}]; a != nil {
			about.decided = a
		}
		if about.flagged || about.decided != nil {
			h := w.hitAt(int32(i), false)
			h.flagged, h.group, h.decided = true, about.group, about.decided
		}
	}
	return nil
}

// stepsOf is the step that wrote the newest version of each of some values of a date, which are counted from the task's first series.
func (w *worker) stepsOf(t task, date rules.Date, at []int) ([]uint32, error) {
	offsets := make([]int, len(at))
	for n, i := range at {
		offsets[n] = t.from + i
	}
	return versionSteps(w.view, date, t.block, offsets)
}

// versionSteps is the step that wrote the newest version of each of some values of a date and block.
func versionSteps(v View, date rules.Date, block uint32, offsets []int) ([]uint32, error) {
	steps := make([]uint32, len(offsets))
	err := v.Layers(Returns, date, block, func(step uint32, vals []int64) error {
		for n, off := range offsets {
			if off < len(vals) && vals[off] != Missing64 {
				steps[n] = step
			}
		}
		return nil
	})
	return steps, err
}

// about is what flags say of one version of a value.
type about struct {
	flagged bool // out of line
	group   string
	decided *rules.Act // nil while nobody has decided
	flags   []rules.Flag
}

// aboutValue gathers the flags that were raised for the version that a step wrote. Decisions about one version agree with each other.
func aboutValue(v View, series uint32, date rules.Date, step uint32) (a about, err error) {
	for _, kind := range rules.Concluded {
		f, ok, err := v.FlagAt(series, date, kind)
		if err != nil {
			return a, err
		}
		if !ok || f.Step < step {
			continue
		}
		a.flags = append(a.flags, f)
		a.group = f.Group
		a.flagged = a.flagged || kind != rules.KindRestated
		if f.Decided != nil {
			a.decided = f.Decided
		}
	}
	return a, nil
}
