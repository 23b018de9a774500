package main

import (
	"fmt"
	"slices"
	"strings"

	"strayd/rules"
	"strayd/rules/drill"
)

// doubtful is the default share of ordinary values flagged doubtful, stale or repeat.
const doubtful = 0.002

var promises = []drill.Promise{
	{Name: "doubtful, stale and repeat", Kinds: []rules.Kind{rules.KindDoubtful, rules.KindStale, rules.KindRepeat}, Share: doubtful},
	{Name: "breach, of own and of residual range", Kinds: []rules.Kind{rules.KindBreach}, Share: 2 * 0.0027},
}

// tally adds up what was caught over books.
type tally struct {
	factors [][]float64 // of the index data, nil for invented ones
	rows    []drill.Row
	named   []map[rules.Cause]int // by row, of those caught
	quiet   []drill.Quiet
	false   map[rules.Cause]int // doubts on untouched days
}

func newTally() *tally {
	t := &tally{rows: make([]drill.Row, len(drill.Floors())), quiet: make([]drill.Quiet, len(promises)), false: map[rules.Cause]int{}}
	for range t.rows {
		t.named = append(t.named, map[rules.Cause]int{})
	}
	return t
}

// book adds the outcomes of one invented book, with and without currencies.
func (t *tally) book(seed uint64) {
	b := drill.Invent(drill.Invention{Seed: seed, FX: seed%2 == 0, Factors: slice(t.factors, seed)})
	fits := drill.NewFits(b)
	for _, round := range drill.Rounds(kinds) {
		plan := drill.Draw(b, fits, drill.Options{Seed: seed, Kinds: round, From: 250})
		planted := plan.Apply(b)
		all := run(planted, doubtful)
		outcomes := drill.Outcomes(planted, plan, all)
		for i, f := range drill.Floors() {
			t.rows[i].Sum(f.Count(planted, outcomes))
			for k := range outcomes {
				if o := outcomes[k : k+1]; o[0].FiveDays() && f.Count(planted, o).Planted > 0 {
					t.named[i][o[0].Named]++
				}
			}
		}
		for _, c := range append(rules.Causes, "") {
			of := slices.DeleteFunc(slices.Clone(all), func(f drill.Flag) bool { return f.LooksLike != c })
			t.false[c] += drill.Untouched(planted, plan, of, promises[:1])[0].Flags
		}
		for i, q := range drill.Untouched(planted, plan, all, promises) {
			t.quiet[i].Name = q.Name
			t.quiet[i].Values += q.Values
			t.quiet[i].Flags += q.Flags
			t.quiet[i].Promised += q.Promised
		}
	}
}

func per(n, of int) float64 {
	if of == 0 {
		return 0
	}
	return 100 * float64(n) / float64(of)
}

// String is the table, with the floors in brackets.
func (t *tally) String() string {
	var s strings.Builder
	fmt.Fprintf(&s, "%-50s %7s  %14s  %14s  %14s\n", "planted", "n", "caught", "right", "wrong")
	for i, f := range drill.Floors() {
		r := &t.rows[i]
		if r.Planted == 0 {
			continue
		}
		mark := ""
		caught, right, wrong := per(f.CaughtIn(r), r.Planted), per(r.Right, r.FiveDays), per(r.Wrong, r.FiveDays)
		if caught < f.Caught || right < f.Right || f.Wrong > 0 && wrong > f.Wrong {
			mark = " <"
		}
		fmt.Fprintf(&s, "%-50s %7d  %6.1f [%5.1f]  %6.1f [%5.1f]  %6.1f [%5.1f] %s %v\n", f.Name, r.Planted, caught, f.Caught, right, f.Right,
			wrong, f.Wrong, mark, t.named[i])
		if f.Followed > 0 {
			fmt.Fprintf(&s, "%50s %7.2f [%.1f]\n", "flags on followers a day", float64(r.Followed)/float64(r.Planted), f.Followed)
		}
	}
	for _, q := range t.quiet {
		fmt.Fprintf(&s, "%-50s %7d values, %d flags, %.0f promised: %.2f times\n", q.Name, q.Values, q.Flags, q.Promised, float64(q.Flags)/q.Promised)
	}
	fmt.Fprintf(&s, "doubts on untouched days look like %v\n", t.false)
	return s.String()
}
