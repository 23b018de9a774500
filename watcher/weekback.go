package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/backrun"
	"strayd/rules/causes"
)

// mostBackRun is how many values a week's back-run holds in memory at most.
const mostBackRun = 40_000_000

// backRuns judges the CoverDates dates up to the week's end under the settings before and after its changes. Values and decisions are those
// known then. It is nil where a ledger is too large for it.
func (w *weekReader) backRuns() ([]rules.BackRun, error) {
	held, err := w.then.Dates(Returns)
	if err != nil {
		return nil, err
	}
	end, _ := slices.BinarySearch(held, w.ask.Span.Sunday()+1)
	first := max(0, end-rules.CoverDates)
	dates := held[max(0, first-w.reach()):end]
	names, err := w.v.Names()
	if err != nil || first == end || len(dates)*names.Len() > mostBackRun {
		return nil, err
	}
	past, err := readPast(w.ctx, w.then, dates, w.progress("reading the past"))
	if err != nil {
		return nil, err
	}
	var sides []*backrun.Side
	for n, s := range []*rules.Settings{w.before, w.settings} {
		side, err := past.Judge(w.ctx, BackRun{Settings: *s, From: held[first], Now: w.ask.Span.AsOf, Progress: func(_ string, done, total int64) {
			w.progress([]string{"settings before", "settings after"}[n])(done, total)
		}})
		if err != nil {
			return nil, err
		}
		sides = append(sides, side)
	}
	return backRuns(sides[0], sides[1], end-first, past.ValuesFrom(held[first])), nil
}

// reach is how many dates before the first one compared decide about it.
func (w *weekReader) reach() int {
	n := causes.Memory
	for _, s := range []*rules.Settings{w.before, w.settings} {
		for _, r := range s.Ranges {
			n = max(n, r.Window)
		}
	}
	return n
}

// backRuns holds what two settings flag against each other: of every kind together, then what is beyond each range's line.
func backRuns(old, now *backrun.Side, dates, values int) []rules.BackRun {
	out := []rules.BackRun{{Dates: dates, JudgedOld: values, BeyondOld: len(old.Flags), JudgedNew: values, BeyondNew: len(now.Flags),
		HeldBefore: true, HeldAfter: true}}
	at := func(name string) *rules.BackRun {
		n := slices.IndexFunc(out, func(b rules.BackRun) bool { return b.Range == name })
		if n < 0 {
			out, n = append(out, rules.BackRun{Range: name, Dates: dates}), len(out)
		}
		return &out[n]
	}
	for _, c := range now.Covers {
		b := at(c.Range)
		b.HeldAfter = true
		b.JudgedNew, b.BeyondNew = b.JudgedNew+c.Outer.Judged, b.BeyondNew+c.Outer.Beyond
	}
	for _, c := range old.Covers {
		b := at(c.Range)
		b.HeldBefore = true
		b.JudgedOld, b.BeyondOld = b.JudgedOld+c.Outer.Judged, b.BeyondOld+c.Outer.Beyond
	}
	return out
}
