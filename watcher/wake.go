package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// wokenNow says by member which values are judged now although the file does not change them; nil for none.
func (l *leader) wokenNow(date rules.Date, r *causes.Result) (out []bool) {
	set := func(m int) {
		if out == nil {
			out = make([]bool, len(l.crew.members))
		}
		out[m] = true
	}
	for _, w := range r.Wrong {
		if !l.fresh[w.Member] {
			set(w.Member)
		}
	}
	for m, woken := range l.woken {
		if woken {
			set(m)
		}
	}
	return out
}

// wake has the values judged that wait for a reference of which the file brings the first value.
func (l *leader) wake() {
	changed := slices.Clone(l.fresh)
	clear(l.woken)
	for m := range l.crew.members {
		ref := l.crew.members[m].Reference
		if ref.Kind == causes.Series && changed[ref.Series] && l.first[ref.Series] && !l.fresh[m] && l.values[m] != rules.Missing {
			l.fresh[m], l.woken[m] = true, true
		}
	}
}

// reference is the number of the series that another is held against, -1 for none.
func (w *weighed) reference(series uint32) int {
	if w == nil {
		return -1
	}
	m, ok := w.crew.at[series]
	if !ok || w.crew.members[m].Reference.Kind != causes.Series {
		return -1
	}
	return int(w.crew.series[w.crew.members[m].Reference.Series])
}
