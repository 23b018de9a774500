package rules

import (
	"slices"
	"time"
)

// TrendWeeks is how many weeks the trend of a feed covers, and ShortTrend the newest of them.
const (
	TrendWeeks = 12
	ShortTrend = 4
)

// FeedFigures are the record of one feed.
type FeedFigures struct {
	Feed string
	FeedWeek
	Complete  Portion // series-days of those expected of it
	Files     int
	Errors    int // values of it that were decided to be wrong in the week
	Changed   int // values restated in the week
	Largest   Num // largest restatement, as a size
	Oldest    Date
	Like      []CauseCount // what the values decided to be wrong looked like
	Weeks     []FeedWeek   // oldest first, the last is this one
	Four, All FeedWeek     // sums over ShortTrend and TrendWeeks weeks
}

// FeedWeek is what one feed delivered in one week.
type FeedWeek struct {
	OnTime                  Portion // valuation dates that fell due
	Rows, Refused, Restated int
}

// CauseCount counts values by what they looked like.
type CauseCount struct {
	Cause Cause
	Count int
}

func (w *FeedWeek) add(o FeedWeek) {
	w.OnTime.Add(o.OnTime)
	w.Rows, w.Refused, w.Restated = w.Rows+o.Rows, w.Refused+o.Refused, w.Restated+o.Restated
}

// FeedRecord is what one feed delivered, over the weeks of the trend.
func (f *WeekFacts) FeedRecord(feed *Feed) FeedFigures {
	out := FeedFigures{Feed: feed.Name, Oldest: NoDate}
	for back := TrendWeeks - 1; back >= 0; back-- {
		span := f.Span
		if back > 0 {
			span = NewWeekSpan(f.Span.Monday-Date(7*back), f.Span.AsOf, f.Zone)
		}
		w := f.feedWeek(feed, span)
		out.Weeks = append(out.Weeks, w)
		out.All.add(w)
		if back < ShortTrend {
			out.Four.add(w)
		}
		out.FeedWeek = w
	}
	for _, x := range f.Files {
		if x.Feed == feed.Name && !x.Refused && f.Span.During(x.At) {
			out.Files++
		}
	}
	for _, d := range f.Days {
		out.Complete.Add(d.Feeds[feed.Name])
	}
	if r := f.Restated[feed.Name]; r.Count > 0 {
		out.Changed, out.Largest, out.Oldest = r.Count, Some(r.Largest), r.Oldest
	}
	f.feedErrors(feed.Name, &out)
	return out
}

// feedWeek counts the files of one week, and the dates that fell due in it: on time when a file with the date or a later one was accepted
// by then and nothing was said to be late. Before its first file a feed owes nothing.
func (f *WeekFacts) feedWeek(feed *Feed, span WeekSpan) (w FeedWeek) {
	var first time.Time
	for _, x := range f.Files {
		if x.Feed != feed.Name {
			continue
		}
		if !x.Refused && (first.IsZero() || x.At.Before(first)) {
			first = x.At
		}
		switch {
		case !span.During(x.At):
		case x.Refused:
			w.Refused++
		default:
			w.Rows += x.Rows
			w.Restated += x.Restated
		}
	}
	if feed.Due == nil || first.IsZero() {
		return w
	}
	end := span.End
	if span.AsOf.Before(end) {
		end = span.AsOf
	}
	for _, date := range DueBetween(*feed.Due, span.Start, end, f.zoneOf(*feed.Due)) {
		due := f.dueAt(*feed.Due, date)
		if due.Before(first) || !f.Calendar.Business(date) {
			continue
		}
		w.OnTime.Whole++
		if f.cameBy(feed.Name, date, due) {
			w.OnTime.Part++
		}
	}
	return w
}

func (f *WeekFacts) cameBy(feed string, date Date, due time.Time) bool {
	late := slices.ContainsFunc(f.Flags, func(g Flag) bool { return g.Kind == KindLate && g.Feed == feed && g.Date == date })
	return !late && slices.ContainsFunc(f.Files, func(x WeekFile) bool {
		return x.Feed == feed && !x.Refused && !x.At.After(due) && x.Last >= date
	})
}

// feedErrors counts the values of a feed that were decided to be wrong.
func (f *WeekFacts) feedErrors(feed string, out *FeedFigures) {
	byRef, like, seen := f.byRef(), map[Cause]int{}, map[uint64]bool{}
	for i := range f.Acts {
		e := &f.Acts[i]
		if e.Deed != Decide || e.Conclusion == Genuine || !f.Span.During(e.At) {
			continue
		}
		for _, ref := range e.Refs {
			g := byRef[ref]
			if g == nil || g.Feed != feed || seen[ref] || g.Decided == nil || g.Decided.Conclusion == Genuine {
				continue
			}
			seen[ref] = true
			out.Errors++
			if g.LooksLike != "" {
				like[g.LooksLike]++
			}
		}
	}
	for c, n := range like {
		out.Like = append(out.Like, CauseCount{c, n})
	}
	slices.SortFunc(out.Like, func(a, b CauseCount) int {
		if a.Count != b.Count {
			return b.Count - a.Count
		}
		return slices.Compare([]byte(a.Cause), []byte(b.Cause))
	})
}
