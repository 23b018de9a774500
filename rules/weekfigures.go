package rules

import (
	"cmp"
	"iter"
	"slices"
)

// WeekFigures are the figures of one week. Those of the week before are the same figures of its own facts.
type WeekFigures struct {
	Span     WeekSpan
	Settings uint32
	Head     string
	Checked  Portion // series-days
	Days     []WeekDay
	Raised   []KindCount
	Flags    int // raised for the dates of the week
	Events   int // separate ones: a market day with the flags it covers is one
	Markets  int
	Ranges   []RangeFigures
	Covers   []CoverFigures // each range: all groups, then each
	Ageing   Ageing
	Closed   Closed
	Found    Found
	Feeds    []FeedFigures
	Largest  []Flag
	Repeats  []Repeat
	Thin     Thin
	Slow     []Flag
	Changes  []Change
	Waivers  Waivers
	Runs     Runs
}

// KindCount counts flags of a kind.
type KindCount struct {
	Kind  Kind
	Count int
}

// mostLargest is how many flags the log lists by their tail.
const mostLargest = 10

// Figures works a week out.
func (f *WeekFacts) Figures() *WeekFigures {
	w := &WeekFigures{Span: f.Span, Settings: f.Settings, Head: f.Head, Days: f.Days, Thin: f.Thin, Changes: f.Changes}
	for _, d := range f.Days {
		w.Checked.Add(d.Portion)
	}
	f.countFlags(w)
	f.ranges(w)
	w.Ageing = f.ageing()
	w.Closed, w.Found = f.closed(), f.found()
	w.Repeats = f.repeats()
	w.Waivers = f.waivers()
	w.Runs = f.runs()
	for i := range f.Feeds {
		w.Feeds = append(w.Feeds, f.FeedRecord(&f.Feeds[i]))
	}
	return w
}

// today is the day on which the week is looked at.
func (f *WeekFacts) today() Date { return DateFrom(f.Span.AsOf.In(f.Zone)) }

// inWeek says whether a flag belongs to the week: by its valuation date, or by when it was raised where it has none.
func (f *WeekFacts) inWeek(g *Flag) bool {
	if g.Date == NoDate {
		return f.Span.During(g.RaisedAt)
	}
	return f.Span.Has(g.Date)
}

type groupDate struct {
	group string
	date  Date
}

func (f *WeekFacts) marketDays() map[groupDate]bool { return marketDaysOf(f.weekFlags()) }

func marketDaysOf(flags []*Flag) map[groupDate]bool {
	out := map[groupDate]bool{}
	for _, g := range flags {
		if g.Kind == KindMarketDay {
			out[groupDate{g.Group, g.Date}] = true
		}
	}
	return out
}

// weekFlags are those that belong to the week.
func (f *WeekFacts) weekFlags() (out []*Flag) {
	for i := range f.Flags {
		if g := &f.Flags[i]; f.inWeek(g) {
			out = append(out, g)
		}
	}
	return out
}

// SeparateEvents counts what some flags are about: those of one series and date are one event, and so is a market day with the breaches of
// its group.
func SeparateEvents(flags []*Flag) int {
	type about struct {
		series string
		date   Date
	}
	market, apart, events := marketDaysOf(flags), 0, map[about]bool{}
	for _, g := range flags {
		switch {
		case g.Kind == KindMarketDay, g.Kind == KindBreach && g.Group != "" && market[groupDate{g.Group, g.Date}]:
		case g.Series == "":
			apart++
		default:
			events[about{g.Series, g.Date}] = true
		}
	}
	return apart + len(events) + len(market)
}

func (f *WeekFacts) countFlags(w *WeekFigures) {
	flags, counts := f.weekFlags(), map[Kind]int{}
	w.Flags, w.Markets, w.Events = len(flags), len(marketDaysOf(flags)), SeparateEvents(flags)
	for _, g := range flags {
		counts[g.Kind]++
		if g.Log10.OK {
			w.Largest = append(w.Largest, *g)
		}
		if g.Kind.Slow() {
			w.Slow = append(w.Slow, *g)
		}
	}
	for _, k := range Kinds {
		w.Raised = append(w.Raised, KindCount{k, counts[k]})
	}
	slices.SortStableFunc(w.Largest, func(a, b Flag) int { return cmp.Compare(a.Log10.V, b.Log10.V) })
	w.Largest = slices.Clip(w.Largest[:min(mostLargest, len(w.Largest))])
}

// RangeFigures hold the breaches of one range in the week against what its line promises.
type RangeFigures struct {
	Range     string
	Level     float64 // 0 where the line states no share
	Judged    int
	Observed  int
	Separate  int // the same with all that a group has beyond on its market day as one
	Expected  float64
	Low, High int     // middle 95 % for independent series
	Wide      int     // upper end of the same, allowing for series that move together
	Narrow    int     // lower end
	Together  float64 // how much wider counts of a day scatter, over the dates before
}

// CoverFigures are the coverage of one range over one group, or over all with "".
type CoverFigures struct {
	Cover
	InnerSays, OuterSays Coverage
}

func (f *WeekFacts) ranges(w *WeekFigures) {
	for covers := range byRange(f.Covers) {
		all := Pool(covers)
		r := f.rangeFigures(&all)
		r.Separate = f.separate(covers)
		w.Ranges = append(w.Ranges, r)
	}
	w.Covers = CoverTable(f.Covers)
}

// byRange goes through covers, which stand by range, one range at a time.
func byRange(covers []Cover) iter.Seq[[]Cover] {
	return func(yield func([]Cover) bool) {
		for len(covers) > 0 {
			n := 1
			for n < len(covers) && covers[n].Range == covers[0].Range {
				n++
			}
			if !yield(covers[:n]) {
				return
			}
			covers = covers[n:]
		}
	}
}

// CoverTable judges covers, which stand by range: those of each range pooled, then each where there are several.
func CoverTable(covers []Cover) (out []CoverFigures) {
	for one := range byRange(covers) {
		out = append(out, judged(Pool(one)))
		if len(one) > 1 {
			for _, c := range one {
				out = append(out, judged(c))
			}
		}
	}
	return out
}

// separate counts the week's values beyond the breach line, those of a group on a market day as one; what the market left unexplained
// stays apart.
func (f *WeekFacts) separate(covers []Cover) (n int) {
	market := f.marketDays()
	for i := range covers {
		for _, d := range Within(covers[i].Days, f.Span.Monday, f.Span.Sunday()) {
			if covers[i].Of == Return && market[groupDate{covers[i].Group, d.Date}] {
				n += min(1, d.Outer)
			} else {
				n += d.Outer
			}
		}
	}
	return n
}

func judged(c Cover) CoverFigures {
	out := CoverFigures{Cover: c, InnerSays: c.Inner.Judge(c.Share, Together(c.Days, InnerOf))}
	if c.Level > 0 {
		out.OuterSays = c.Outer.Judge(c.Level, Together(c.Days, OuterOf))
	}
	return out
}

func (f *WeekFacts) rangeFigures(c *Cover) RangeFigures {
	r := RangeFigures{Range: c.Range, Level: c.Level, Together: 1}
	for _, d := range Within(c.Days, f.Span.Monday, f.Span.Sunday()) {
		r.Judged += d.Judged
		r.Observed += d.Outer
	}
	if r.Level == 0 {
		return r
	}
	r.Expected = float64(r.Judged) * r.Level
	// The inner line has more to go by; the week itself must not widen its own band.
	r.Together = Together(Within(c.Days, 0, f.Span.Monday-1), InnerOf)
	r.Low, r.High = Band(r.Judged, r.Level, 1)
	r.Narrow, r.Wide = Band(r.Judged, r.Level, r.Together)
	return r
}
