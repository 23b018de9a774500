package main

import (
	"math"

	"strayd/rules"
	"strayd/rules/causes"
	"strayd/rules/drill"
)

// breachZ is the breach line of 0.27 % under a t5 of unit variance, in deviations.
const breachZ = 4.273

// kinds are those that the pool alone can see: the gate of whole files is another room's.
var kinds = func() (out []drill.Kind) {
	for _, k := range drill.Kinds {
		if !k.File() || k.Lasting() {
			out = append(out, k)
		}
	}
	return out
}()

// poolOf makes a pool for a book.
func poolOf(b *drill.Book, doubtful float64) *causes.Pool {
	events := map[string][]rules.Event{}
	for _, e := range b.Events {
		events[e.Series] = append(events[e.Series], e)
	}
	var groups []string
	at := map[string]int{"": -1}
	var members []causes.Member
	for i := range b.Series {
		s := &b.Series[i]
		if _, ok := at[s.Group]; !ok {
			at[s.Group] = len(groups)
			groups = append(groups, s.Group)
		}
		m := causes.Member{ID: s.ID, Group: at[s.Group], FX: s.FX, Events: events[s.ID], Feed: s.Feed}
		switch {
		case s.Reference >= 0:
			m.Reference = causes.Reference{Kind: causes.Series, Series: s.Reference}
		case s.Peers:
			m.Reference.Kind = causes.Peers
		}
		members = append(members, m)
	}
	return causes.NewPool(members, groups, doubtful)
}

// flags leads a pool through a book and raises what the pass would: breaches of own and residual ranges, doubts, and wrong references.
type flags struct {
	book *drill.Book
	out  []drill.Flag
	at   map[[2]int]int // by date and series
}

func run(b *drill.Book, doubtful float64) []drill.Flag {
	p := poolOf(b, doubtful)
	f := &flags{book: b, at: map[[2]int]int{}}
	for t, d := range b.Dates {
		r := p.Step(causes.Day{Date: d, Values: b.Values[t]})
		f.day(t, r)
	}
	return f.out
}

func (f *flags) day(t int, r *causes.Result) {
	for _, v := range r.Views {
		kind := v.Kind
		if breach := math.Abs(v.Z) > breachZ || math.Abs(v.OwnZ) > breachZ; breach && v.LooksLike != rules.CauseSpike && v.LooksLike != rules.CauseShifted {
			kind = rules.KindBreach
		}
		if kind != "" {
			f.raise(t, t, v.Member, kind, v.LooksLike)
		}
	}
	for _, v := range r.Earlier {
		if n, ok := f.at[[2]int{t - 1, v.Member}]; ok {
			f.out[n].LooksLike = v.LooksLike
		} else {
			f.raise(t-1, t, v.Member, rules.KindDoubtful, v.LooksLike)
		}
	}
	for _, w := range r.Wrong {
		f.raise(t, t, w.Member, rules.KindDoubtful, rules.CauseReference)
	}
	if len(r.Shifted) > 0 {
		s := f.book.Series[r.Shifted[0]]
		f.out = append(f.out, drill.Flag{Date: f.book.Dates[t], Raised: f.book.Dates[t], Feed: s.Feed, Kind: rules.KindRefused,
			LooksLike: rules.CauseShifted})
	}
}

func (f *flags) raise(on, raised, member int, kind rules.Kind, looks rules.Cause) {
	f.at[[2]int{on, member}] = len(f.out)
	s := f.book.Series[member]
	f.out = append(f.out, drill.Flag{Date: f.book.Dates[on], Raised: f.book.Dates[raised], Series: s.ID, Group: s.Group, Feed: s.Feed,
		Kind: kind, LooksLike: looks})
}
