package main

import (
	"testing"

	"strayd/rules"
	"strayd/rules/causes"
	"strayd/rules/drill"
)

// poolOf makes a pool of a book, as the pass does.
func poolOf(b *drill.Book) *causes.Pool {
	groups, at := []string{}, map[string]int{"": -1}
	var members []causes.Member
	for i := range b.Series {
		s := &b.Series[i]
		if _, ok := at[s.Group]; !ok {
			at[s.Group] = len(groups)
			groups = append(groups, s.Group)
		}
		m := causes.Member{ID: s.ID, Group: at[s.Group], FX: s.FX}
		switch {
		case s.Reference >= 0:
			m.Reference = causes.Reference{Kind: causes.Series, Series: s.Reference}
		case s.Peers:
			m.Reference.Kind = causes.Peers
		}
		members = append(members, m)
	}
	return causes.NewPool(members, groups, 0.002)
}

// Books without errors, of many habits: no file of theirs looks a day off, few references look wrong, and doubt stays within 1.5 times its
// share beside three deviations of a count that comes in clusters.
func TestHonestBooks(t *testing.T) {
	seeds := uint64(2)
	if !testing.Short() {
		seeds = 4
	}
	for _, h := range honestBooks() {
		values, doubts, wrong, dates := 0, 0, 0, 0
		for seed := range seeds {
			b := h.make(100 + seed)
			p := poolOf(b)
			for n, d := range b.Dates {
				r := p.Step(causes.Day{Date: d, Values: b.Values[n]})
				if n < min(honestFrom, len(b.Dates)/2) {
					continue
				}
				dates++
				wrong += len(r.Wrong)
				if len(r.Shifted) > 0 {
					t.Errorf("%s, seed %d: the file of %s looks a day off", h.name, 100+seed, d)
				}
				for _, u := range b.Values[n] {
					if u != rules.Missing {
						values++
					}
				}
				for _, v := range r.Views {
					if v.Kind != "" {
						doubts++
					}
				}
			}
		}
		t.Logf("%-34s %d dates, %d doubts of %d values, %.2f of their share; %d references wrong", h.name, dates, doubts, values,
			float64(doubts)/(0.002*float64(values)), wrong)
	}
}
