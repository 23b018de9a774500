package backrun

import (
	"slices"

	"strayd/rules"
)

// Kinds are those that a back-run raises: the others are about files, deadlines and weeks.
var Kinds = append(slices.Clone(rules.OutOfLine), rules.KindMarketDay)

// datesAWeek turns dates into weeks.
const datesAWeek = 5

// Comparison is one past under one set of settings, or two.
type Comparison struct {
	Dates  []rules.Date // that are compared, ascending
	Values int          // on these
	Sides  []*Side
	Issued []rules.Flag // that the ledger has, of whatever date and kind
}

// Weeks is how many weeks of five dates are compared.
func (c *Comparison) Weeks() float64 { return float64(len(c.Dates)) / datesAWeek }

// Expected is how many values the breach lines of a side promise beyond them, over all ranges that state a share; and how many at most are
// doubtful, stale or repeat.
func (c *Comparison) Expected(s *Side) (breaches, doubts float64) {
	for i := range s.Covers {
		breaches += s.Covers[i].Level * float64(s.Covers[i].Outer.Judged)
	}
	return breaches, s.Settings.Doubtful * float64(c.Values)
}

// Count is how many flags of a sort each side raises.
type Count struct {
	Group string // "" for all
	Kind  rules.Kind
	Flags []int // by side
}

// Total, Events and Busiest stand for a kind in a count: all flags; what they are about, a market day as one; and the flags of the calendar
// week that has the most.
const (
	Total   rules.Kind = "all"
	Events  rules.Kind = "events"
	Busiest rules.Kind = "busiest week"
)

// Counts are the flags of all groups by kind, then those of each group.
func (c *Comparison) Counts() (out []Count) {
	for _, k := range append([]rules.Kind{Total}, Kinds...) {
		row := Count{Kind: k}
		for _, s := range c.Sides {
			row.Flags = append(row.Flags, s.count(k, nil))
		}
		if k == Total || slices.Max(row.Flags) > 0 {
			out = append(out, row)
		}
	}
	events, busiest := Count{Kind: Events}, Count{Kind: Busiest}
	for _, s := range c.Sides {
		events.Flags, busiest.Flags = append(events.Flags, s.events()), append(busiest.Flags, s.busiest())
	}
	return append(append(out, events, busiest), c.byGroup()...)
}

func (c *Comparison) byGroup() (out []Count) {
	var groups []string
	for _, s := range c.Sides {
		for i := range s.Flags {
			groups = append(groups, s.Flags[i].Group)
		}
		for i := range s.Covers {
			groups = append(groups, s.Covers[i].Group)
		}
	}
	slices.Sort(groups)
	for _, g := range slices.Compact(groups) {
		row := Count{Group: g, Kind: Total}
		for _, s := range c.Sides {
			row.Flags = append(row.Flags, s.count(Total, &g))
		}
		if g != "" {
			out = append(out, row)
		}
	}
	return out
}

func (s *Side) count(k rules.Kind, group *string) (n int) {
	for i := range s.Flags {
		if f := &s.Flags[i]; (k == Total || f.Kind == k) && (group == nil || f.Group == *group) {
			n++
		}
	}
	return n
}

func (s *Side) events() int {
	flags := make([]*rules.Flag, len(s.Flags))
	for i := range s.Flags {
		flags[i] = &s.Flags[i]
	}
	return rules.SeparateEvents(flags)
}

func (s *Side) busiest() (most int) {
	weeks := map[rules.Date]int{}
	for i := range s.Flags {
		monday := rules.MondayOf(s.Flags[i].Date)
		weeks[monday]++
		most = max(most, weeks[monday])
	}
	return most
}

// subject is what a flag is about: a series, or a group on a market day.
type subject struct {
	series, group string
	date          rules.Date
}

func subjectOf(f *rules.Flag) subject {
	if f.Series == "" {
		return subject{group: f.Group, date: f.Date}
	}
	return subject{series: f.Series, date: f.Date}
}

// flagged are the flags of a side by what they are about, the first kind of each.
func (s *Side) flagged() map[subject]*rules.Flag {
	out := make(map[subject]*rules.Flag, len(s.Flags))
	for i := range s.Flags {
		f := &s.Flags[i]
		if old := out[subjectOf(f)]; old == nil || slices.Index(Kinds, f.Kind) < slices.Index(Kinds, old.Kind) {
			out[subjectOf(f)] = f
		}
	}
	return out
}
