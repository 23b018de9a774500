package watcher

import (
	"strayd/rules"
)

// markedHits finds the values of a date held before that were flagged as they stand. What a flag says of one version it does not say
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
		f, stands, err := w.standingFlag(t.series(i), d.date, steps[n])
		if err != nil {
			return err
		}
		if stands {
			h := w.hitAt(int32(i), false)
			h.flagged, h.group = true, f.Group
		}
	}
	return nil
}

// stepsOf is the step that wrote the newest version of each of some values of a date.
func (w *worker) stepsOf(t task, date rules.Date, at []int) ([]uint32, error) {
	steps := make([]uint32, len(at))
	err := w.view.Layers(Returns, date, t.block, func(step uint32, vals []int64) error {
		for n, i := range at {
			if off := t.from + i; off < len(vals) && vals[off] != Missing64 {
				steps[n] = step
			}
		}
		return nil
	})
	return steps, err
}

// standingFlag is a flag about a value out of line that was raised for the version that a step wrote; ok is false when there is
// none.
func (w *worker) standingFlag(series uint32, date rules.Date, step uint32) (f rules.Flag, ok bool, err error) {
	for _, kind := range rules.OutOfLine {
		f, ok, err := w.view.FlagAt(series, date, kind)
		if err != nil || ok && f.Step == step {
			return f, ok, err
		}
	}
	return rules.Flag{}, false, nil
}
