package watcher

import "strayd/rules"

// weekValues is what the dates of the week say of each series, whatever its ranges.
type weekValues struct{ values, zeros []int }

func newWeekValues(width int) *weekValues {
	return &weekValues{make([]int, width), make([]int, width)}
}

func (w *weekValues) take(raw []int64) {
	for i, x := range raw {
		if x == Missing64 {
			continue
		}
		w.values[i]++
		if x == 0 {
			w.zeros[i]++
		}
	}
}

// leastZeros is how many values a week needs to be called nothing but zeros.
const leastZeros = 3

func (w *weekScan) foldThin(t task, week *weekValues) {
	for i := range t.width {
		name := string(w.j.names.Name(t.series(i)))
		last := rules.NoDate
		thin, unjudged := false, false
		for k, l := range w.lanes {
			last = max(last, l.last[i])
			thin, unjudged = thin || w.tracks[k][i].thin && !w.tracks[k][i].unjudged, unjudged || w.tracks[k][i].unjudged
		}
		if week.values[i] == 0 {
			life, known := w.settings.Lives[name]
			ended := known && life.End != rules.NoDate && life.End < w.week
			if !ended && last != rules.NoDate && rules.Weekdays(last, w.week+6) > rules.DormantAfter {
				w.thin.Dormant.Add(name)
			}
			continue
		}
		w.thin.Series++
		if thin {
			w.thin.Provisional.Add(name)
		}
		if unjudged {
			w.thin.Unjudged.Add(name)
		}
		if week.zeros[i] == week.values[i] && week.values[i] >= leastZeros {
			w.thin.Zero.Add(name)
		}
	}
}
