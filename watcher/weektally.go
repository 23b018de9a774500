package watcher

import "strayd/rules"

// fold counts the series of a task into their groups.
func (w *weekScan) fold(t task, tracks [][]track) {
	for k := range tracks {
		for i := range tracks[k] {
			if x := &tracks[k][i]; x.judged > 0 {
				w.at[k][i].Take(string(w.j.names.Name(t.series(i))), tallyOf(x.judged, x.outer), tallyOf(x.judged, x.inner))
			}
		}
	}
}

// tallyOf counts the newest CoverDates of so many judged values, of which those at the given places, from 1 and ascending, were beyond.
func tallyOf(judged int, beyond []int) (c rules.CoverTally) {
	first := max(1, judged-rules.CoverDates+1)
	c.Judged = judged - first + 1
	before := 0 // the hit before
	for _, at := range beyond {
		if at < first {
			continue
		}
		c.Beyond++
		switch {
		case at == first: // it follows nothing
		case before == at-1:
			c.Transitions.N11++
		default:
			c.Transitions.N01++
		}
		before = at
	}
	n := &c.Transitions
	n.N10 = c.Beyond - n.N11
	if before == judged && c.Beyond > 0 { // nothing follows it
		n.N10--
	}
	n.N00 = max(0, c.Judged-1-n.N01-n.N10-n.N11)
	return c
}

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

func (w *weekScan) foldThin(t task, tracks [][]track, week *weekValues) {
	for i := range t.width {
		name := string(w.j.names.Name(t.series(i)))
		last := rules.NoDate
		thin, unjudged := false, false
		for k, l := range w.lanes {
			last = max(last, l.last[i])
			thin, unjudged = thin || tracks[k][i].thin && !tracks[k][i].unjudged, unjudged || tracks[k][i].unjudged
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
