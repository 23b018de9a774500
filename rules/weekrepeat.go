package rules

import (
	"cmp"
	"slices"
	"time"
)

// Repeat is a series that keeps being flagged.
type Repeat struct {
	Series, Group string
	Flags         int    // dates with a flag about a value, of the last repeatDates business days
	Reason        Reason // given more than once in the last reasonDates business days, "" for none
	Times         int    // how often
}

// PRACTICE of the trade, no source: three flags in twenty days, or the same reason twice in sixty.
const (
	repeatDates, repeatFlags = 20, 3
	reasonDates, reasonTimes = 60, 2
	// MostRepeats is how many repeat offenders the log names.
	MostRepeats = 20
)

func (f *WeekFacts) repeats() []Repeat {
	flags, reasons := f.flagDates(), f.reasonsGiven()
	var out []Repeat
	add := func(series string) {
		r := Repeat{Series: series, Group: flags[series].group, Flags: len(flags[series].dates)}
		for _, reason := range Reasons {
			if n := reasons[series][reason]; n >= reasonTimes && n > r.Times {
				r.Reason, r.Times = reason, n
			}
		}
		if r.Flags >= repeatFlags || r.Times > 0 {
			out = append(out, r)
		}
	}
	for series := range flags {
		add(series)
	}
	for series := range reasons {
		if _, done := flags[series]; !done {
			add(series)
		}
	}
	slices.SortFunc(out, func(a, b Repeat) int {
		return cmp.Or(b.Flags-a.Flags, b.Times-a.Times, cmp.Compare(a.Series, b.Series))
	})
	return out
}

type flagged struct {
	group string
	dates map[Date]bool
}

func (f *WeekFacts) flagDates() map[string]flagged {
	since, out := f.Calendar.Add(f.Span.Sunday(), -repeatDates), map[string]flagged{}
	for i := range f.Flags {
		g := &f.Flags[i]
		if g.Series == "" || g.Date <= since || g.Date > f.Span.Sunday() || !slices.Contains(OutOfLine, g.Kind) {
			continue
		}
		if out[g.Series].dates == nil {
			out[g.Series] = flagged{g.Group, map[Date]bool{}}
		}
		out[g.Series].dates[g.Date] = true
	}
	return out
}

// reasonsGiven counts by series the reasons of the newest decisions, each date once. A market move may come again.
func (f *WeekFacts) reasonsGiven() map[string]map[Reason]int {
	since, out := f.Calendar.Add(f.today(), -reasonDates), map[string]map[Reason]int{}
	byRef := f.byRef()
	type about struct {
		series string
		date   Date
		reason Reason
	}
	seen := map[about]bool{}
	for i := range f.Acts {
		e := &f.Acts[i]
		if e.Deed != Decide || e.Reason == MarketMove || DateFrom(e.At.In(f.Zone)) <= since {
			continue
		}
		for _, ref := range e.Refs {
			g := byRef[ref]
			if g == nil || g.Series == "" || seen[about{g.Series, g.Date, e.Reason}] {
				continue
			}
			seen[about{g.Series, g.Date, e.Reason}] = true
			if out[g.Series] == nil {
				out[g.Series] = map[Reason]int{}
			}
			out[g.Series][e.Reason]++
		}
	}
	return out
}

func (f *WeekFacts) byRef() map[uint64]*Flag {
	out := make(map[uint64]*Flag, len(f.Flags))
	for i := range f.Flags {
		out[f.Flags[i].Ref] = &f.Flags[i]
	}
	return out
}

// Runs is the record of passes and messages.
type Runs struct {
	Due, Made, Failed              int
	Quiet                          time.Duration // longest time without a pass that ended well, from the first to the last
	Notices, Sent, Waiting, Undone int           // Undone failed for good
}

func (f *WeekFacts) runs() (r Runs) {
	r.Due = f.Due
	var last time.Time
	for _, p := range f.Passes {
		r.Made++
		if p.Failed {
			r.Failed++
			continue
		}
		if !last.IsZero() {
			r.Quiet = max(r.Quiet, p.Ended.Sub(last))
		}
		last = p.Ended
	}
	for _, n := range f.Notices {
		if n.State == NoticeWithdrawn {
			continue
		}
		r.Notices++
		switch n.State {
		case NoticeSent:
			r.Sent++
		case NoticeFailed:
			r.Undone++
		default:
			r.Waiting++
		}
	}
	return r
}
