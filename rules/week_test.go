package rules

import (
	"slices"
	"strings"
	"testing"
	"time"
)

func day(t testing.TB, s string) Date {
	t.Helper()
	d, err := ParseDate(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func instant(t testing.TB, s string) time.Time {
	t.Helper()
	at, err := time.Parse(time.RFC3339, s)
	if err != nil {
		t.Fatal(err)
	}
	return at
}

// ISO 8601 weeks, from the standard's rule (the week with the year's first Thursday is week 1); the last two are its own examples.
func TestWeekNames(t *testing.T) {
	for _, c := range []struct{ date, name, monday string }{
		{"2026-03-09", "2026-W11", "2026-03-09"},
		{"2026-03-15", "2026-W11", "2026-03-09"},
		{"2025-12-29", "2026-W01", "2025-12-29"},
		{"2021-01-03", "2020-W53", "2020-12-28"},
		{"2008-12-29", "2009-W01", "2008-12-29"},
		{"2010-01-03", "2009-W53", "2009-12-28"},
	} {
		d, monday := day(t, c.date), day(t, c.monday)
		if got := WeekName(d); got != c.name {
			t.Errorf("%s is in %s, want %s", c.date, got, c.name)
		}
		for _, text := range []string{c.name, strings.ToLower(c.name), c.date} {
			if got, err := ParseWeek(text); err != nil || got != monday {
				t.Errorf("%s begins on %s (%v), want %s", text, got, err, c.monday)
			}
		}
	}
	for _, bad := range []string{"", "2026", "2026-W", "2026-W00", "2026-W54", "2025-W53", "2026-W1", "26-W11", "2026-W+1", "2026-02-30", "W11", "2026-W111"} {
		if got, err := ParseWeek(bad); err == nil {
			t.Errorf("week %q is taken for %s", bad, got)
		}
	}
	for d := day(t, "1990-01-01"); d < day(t, "2040-01-01"); d += 7 {
		if got, err := ParseWeek(WeekName(d)); err != nil || got != d {
			t.Fatalf("%s: %s is read as %s (%v)", d, WeekName(d), got, err)
		}
	}
}

func TestWeekSpan(t *testing.T) {
	zone, err := time.LoadLocation("Europe/Berlin")
	if err != nil {
		t.Fatal(err)
	}
	monday := day(t, "2026-03-23") // clocks go forward on Sunday 2026-03-29
	for _, c := range []struct{ now, asOf string }{
		{"2026-03-27T10:00:00Z", "2026-03-27T10:00:00Z"},
		{"2026-03-30T05:00:00Z", "2026-03-30T05:00:00Z"},
		{"2026-04-08T10:00:00Z", "2026-03-30T22:00:00Z"}, // the end of the Monday after, local time
	} {
		s := NewWeekSpan(monday, instant(t, c.now), zone)
		if !s.AsOf.Equal(instant(t, c.asOf)) || !s.Start.Equal(instant(t, "2026-03-22T23:00:00Z")) || !s.End.Equal(instant(t, "2026-03-29T22:00:00Z")) {
			t.Errorf("as of %s: %+v", c.now, s)
		}
		b := s.Before(zone)
		if b.Monday != monday-7 || b.AsOf.In(zone).Format("15:04:05") != s.AsOf.In(zone).Format("15:04:05") {
			t.Errorf("as of %s: the week before is %+v", c.now, b)
		}
	}
	for _, c := range []struct{ now, monday string }{
		{"2026-03-30T05:00:00Z", "2026-03-23"}, // Monday morning
		{"2026-03-27T17:00:00Z", "2026-03-23"}, // Friday evening
		{"2026-03-25T10:00:00Z", "2026-03-16"}, // Wednesday
		{"2026-03-29T10:00:00Z", "2026-03-23"}, // Sunday
	} {
		if got := WeekNow(instant(t, c.now), zone); got != day(t, c.monday) {
			t.Errorf("at %s the week is that of %s, want %s", c.now, got, c.monday)
		}
	}
}

// weekOf is a week in which nothing happened, for cases to add to.
func weekOf(t testing.TB) *WeekFacts {
	return &WeekFacts{Span: NewWeekSpan(day(t, "2026-03-09"), instant(t, "2026-03-16T07:00:00Z"), time.UTC), Zone: time.UTC,
		Days: []WeekDay{{Date: day(t, "2026-03-09"), Portion: Portion{10, 10}}}}
}

func raised(ref uint64, series, date, at string, t testing.TB) Flag {
	return Flag{Ref: ref, Series: series, Group: "equity", Kind: KindBreach, Date: day(t, date), RaisedAt: instant(t, at), Standing: Open, Return: Missing}
}

// Ages are counted by hand on the calendar of March 2026, whose 9th is a Monday.
func TestAgeing(t *testing.T) {
	f := weekOf(t)
	f.Groups = []Group{{Name: "equity", Owner: "desk-one", Reply: 2 * time.Hour, Release: &Due{Minutes: 11 * 60, Days: 1}}}
	f.Owner = func(series string) string { return map[string]string{"birch": "her"}[series] }
	f.Flags = []Flag{
		raised(1, "alder", "2026-03-13", "2026-03-16T06:30:00Z", t), // 0 days
		raised(2, "birch", "2026-03-12", "2026-03-13T06:00:00Z", t), // 1
		raised(3, "cedar", "2026-03-11", "2026-03-12T06:00:00Z", t), // 2
		raised(4, "dale", "2026-03-06", "2026-03-09T06:00:00Z", t),  // 5
		raised(5, "elder", "2026-03-05", "2026-03-06T06:00:00Z", t), // 6
		raised(6, "fir", "2026-02-27", "2026-03-02T06:00:00Z", t),   // 10
		raised(7, "gorse", "2026-02-26", "2026-02-27T06:00:00Z", t), // 11
		raised(8, "hazel", "2026-02-26", "2026-02-27T06:00:00Z", t), // signed off
	}
	f.Flags[7].Standing = SignedOff
	f.Flags[3].Standing = Acknowledged
	a := f.Figures().Ageing
	if a.Open != 7 || !slices.Equal(a.Bands, []int{2, 2, 2, 1}) {
		t.Errorf("%d open by %v, want 7 by [2 2 2 1]", a.Open, a.Bands)
	}
	if a.Replies != 7 || a.PastReply != 5 { // not the one raised half an hour ago, nor the acknowledged one
		t.Errorf("%d of %d past their reply-by time, want 5 of 7", a.PastReply, a.Replies)
	}
	if a.PastRelease != 6 { // that of the 13th is released on Monday at 11:00
		t.Errorf("%d past their release, want 6", a.PastRelease)
	}
	if a.Oldest[0].Ref != 7 || a.Oldest[0].Days != 11 || a.Oldest[0].Owner != "desk-one" || a.Oldest[5].Owner != "her" {
		t.Errorf("the oldest are %+v", a.Oldest)
	}
}

func decided(refs []uint64, at string, c Conclusion, r Reason, note string, t testing.TB) Entry {
	return Entry{Act: Act{Deed: Decide, By: Person{1001, "ada"}, At: instant(t, at), Conclusion: c, Reason: r, Note: note, Until: NoDate, Value: Missing}, Refs: refs}
}

func TestClosed(t *testing.T) {
	f := weekOf(t)
	for ref := uint64(1); ref <= 6; ref++ {
		f.Flags = append(f.Flags, raised(ref, string(rune('a'+ref)), "2026-03-10", "2026-03-10T06:00:00Z", t))
	}
	f.Flags[5].Kind = KindRestated
	override := decided([]uint64{4}, "2026-03-12T06:00:00Z", Genuine, MarketMove, "all fell", t)
	override.Override, override.By = "the index too", Person{0, "root"}
	f.Acts = []Entry{
		decided([]uint64{1}, "2026-03-08T23:59:59Z", Erroneous, DataError, "before the week", t),
		decided([]uint64{1, 2}, "2026-03-10T08:00:00Z", Genuine, KnownEvent, "known", t), // 2 h, and flag 1 again later
		decided([]uint64{1}, "2026-03-10T10:00:00Z", Erroneous, DataError, "no: found by client", t),
		decided([]uint64{3}, "2026-03-10T12:00:00Z", Corrected, ForDistribution, "", t),
		override,
		decided([]uint64{5}, "2026-03-11T06:00:00Z", Erroneous, DataError, "Found by Provider", t),
		decided([]uint64{6}, "2026-03-11T06:00:00Z", Erroneous, DataError, "", t),
		decided([]uint64{5}, "2026-03-16T06:00:00Z", Genuine, KnownEvent, "after the week", t),
	}
	c := f.Figures().Closed
	if c.Decided != 6 || c.Genuine != 2 || c.Erroneous != 3 || c.Corrected != 1 {
		t.Errorf("%+v: want 6 decided, 2 genuine, 3 error, 1 corrected", c)
	}
	if c.MedianHours != Some(15) { // hours 2, 4, 6, 24, 24, 48
		t.Errorf("median hours %v, want 15", c.MedianHours)
	}
	if c.ByClient != 1 || c.ByProvider != 2 || c.ByUs != 1 || c.AsRoot != 1 || len(c.Overridden) != 1 || c.Overridden[0].Ref != 4 {
		t.Errorf("%+v: want 1 by a client, 2 by the provider, 1 by us, 1 as root, flag 4 overridden", c)
	}
	want := map[Reason]int{MarketMove: 1, KnownEvent: 1, ForDistribution: 1, DataError: 3}
	for _, r := range c.Reasons {
		if r.Count != want[r.Reason] {
			t.Errorf("%s: %d, want %d", r.Reason, r.Count, want[r.Reason])
		}
	}
}

func TestEvents(t *testing.T) {
	f := weekOf(t)
	market := raised(1, "", "2026-03-11", "2026-03-12T06:00:00Z", t)
	market.Kind = KindMarketDay
	late := raised(6, "", "2026-03-11", "2026-03-12T06:00:00Z", t)
	late.Kind, late.Group = KindLate, ""
	limit := raised(5, "cedar", "2026-03-12", "2026-03-12T06:00:00Z", t)
	limit.Kind = KindLimit
	refused := raised(8, "", "2026-03-11", "2026-03-13T06:00:00Z", t)
	refused.Kind, refused.Date = KindRefused, NoDate
	before := refused
	before.Ref, before.RaisedAt = 9, instant(t, "2026-03-08T06:00:00Z")
	f.Flags = []Flag{market, raised(2, "alder", "2026-03-11", "2026-03-12T06:00:00Z", t), raised(3, "birch", "2026-03-11", "2026-03-12T06:00:00Z", t),
		raised(4, "cedar", "2026-03-12", "2026-03-12T06:00:00Z", t), limit, late, raised(7, "alder", "2026-03-06", "2026-03-09T06:00:00Z", t), refused, before}
	w := f.Figures()
	// One market day with its two breaches; cedar's breach and limit; the late feed; the refused file. Flags 7 and 9 are of the week before.
	if w.Flags != 7 || w.Events != 4 || w.Markets != 1 {
		t.Errorf("%d flags, %d events, %d market days; want 7, 4 and 1", w.Flags, w.Events, w.Markets)
	}
	f.Covers = []Cover{{Range: "own", Of: Return, Group: "equity", Level: 0.0027, Share: 0.01, Days: []CoverDay{
		{day(t, "2026-03-06"), 40, 3, 5}, {day(t, "2026-03-11"), 40, 30, 35}, {day(t, "2026-03-12"), 40, 2, 3}}},
		{Range: "rest", Of: Residual, Group: "equity", Level: 0.0027, Share: 0.01, Days: []CoverDay{{day(t, "2026-03-11"), 40, 2, 2}}}}
	ranges := f.Figures().Ranges
	if r := ranges[0]; r.Judged != 80 || r.Observed != 32 || r.Separate != 3 {
		t.Errorf("own: %+v, want 32 of 80 beyond, 3 with the market day as one", r)
	}
	if r := ranges[1]; r.Separate != 2 {
		t.Errorf("residual: %+v, want 2: what a market day leaves unexplained stays apart", r)
	}
}

func TestRepeats(t *testing.T) {
	f := weekOf(t)
	at := "2026-03-13T06:00:00Z"
	f.Flags = []Flag{
		raised(1, "often", "2026-02-16", at, t), // 20 business days back to Sunday the 15th reach the 16th of February
		raised(2, "often", "2026-03-02", at, t), raised(3, "often", "2026-03-13", at, t),
		raised(4, "edge", "2026-02-13", at, t), raised(5, "edge", "2026-03-02", at, t), raised(6, "edge", "2026-03-13", at, t),
		raised(7, "same", "2026-01-05", at, t), raised(8, "same", "2026-01-06", at, t),
		raised(9, "twice-a-day", "2026-03-02", at, t), raised(10, "twice-a-day", "2026-03-02", at, t), raised(11, "twice-a-day", "2026-03-03", at, t),
		raised(12, "market", "2026-01-05", at, t), raised(13, "market", "2026-01-06", at, t),
	}
	f.Flags[9].Kind = KindLimit
	f.Acts = []Entry{decided([]uint64{7}, "2026-01-06T08:00:00Z", Erroneous, DataError, "", t), decided([]uint64{8}, "2026-01-07T08:00:00Z", Erroneous, DataError, "", t),
		decided([]uint64{8}, "2026-01-08T08:00:00Z", Erroneous, DataError, "said again", t),
		decided([]uint64{12, 13}, "2026-01-08T08:00:00Z", Genuine, MarketMove, "", t)}
	got := f.Figures().Repeats
	if len(got) != 2 || got[0].Series != "often" || got[0].Flags != 3 || got[1].Series != "same" || got[1].Reason != DataError || got[1].Times != 2 {
		t.Errorf("repeat offenders %+v, want often with 3 dates, and same with a data error twice", got)
	}
}

func TestFeedRecord(t *testing.T) {
	f := weekOf(t)
	f.Feeds = []Feed{{Name: "book", Due: &Due{Minutes: 19*60 + 30}}}
	file := func(at, last string, rows int) WeekFile {
		return WeekFile{Feed: "book", At: instant(t, at), Last: day(t, last), Rows: rows}
	}
	f.Files = []WeekFile{file("2026-03-05T18:00:00Z", "2026-03-05", 500), file("2026-03-06T18:00:00Z", "2026-03-06", 10),
		file("2026-03-09T18:00:00Z", "2026-03-09", 10), file("2026-03-10T19:31:00Z", "2026-03-10", 10), // a minute late
		{Feed: "book", At: instant(t, "2026-03-11T18:00:00Z"), Last: NoDate, Refused: true},
		file("2026-03-12T18:00:00Z", "2026-03-12", 10), // brings the 12th; the 11th never came
		file("2026-03-13T18:00:00Z", "2026-03-13", 10), {Feed: "other", At: instant(t, "2026-03-13T18:00:00Z"), Rows: 99}}
	late := Flag{Ref: 1, Kind: KindLate, Feed: "book", Date: day(t, "2026-03-13"), RaisedAt: instant(t, "2026-03-13T19:30:00Z"), Standing: Open, Return: Missing}
	f.Flags = []Flag{late} // the 13th came, and was not whole
	f.Restated = map[string]Restatements{"book": {2, 0.0038, day(t, "2026-03-02")}}
	f.Days = []WeekDay{{day(t, "2026-03-09"), Portion{18, 20}, map[string]Portion{"book": {9, 10}}}, {day(t, "2026-03-10"), Portion{20, 20}, map[string]Portion{"book": {10, 10}}}}
	got := f.Figures().Feeds[0]
	if got.OnTime != (Portion{2, 5}) { // the 9th and the 12th
		t.Errorf("on time %v, want 2 of 5", got.OnTime)
	}
	if got.All.OnTime != (Portion{4, 7}) || got.Four.OnTime != (Portion{4, 7}) { // the 5th and the 6th too; nothing was due before the first file
		t.Errorf("on time over 12 weeks %v, want 4 of 7", got.All.OnTime)
	}
	if got.Rows != 40 || got.Files != 4 || got.Refused != 1 || got.All.Rows != 550 || got.Complete != (Portion{19, 20}) {
		t.Errorf("%+v: want 40 rows in 4 files, 1 refused, 550 rows over 12 weeks, 19 of 20 complete", got)
	}
	if got.Changed != 2 || got.Largest != Some(0.0038) || got.Oldest != day(t, "2026-03-02") {
		t.Errorf("restatements %+v", got)
	}
}

func TestWaiversAndRuns(t *testing.T) {
	f := weekOf(t)
	waive := func(f Flag, s Standing, until string) Flag {
		f.Standing, f.Last = s, &Act{Deed: Waive, Until: day(t, until)}
		return f
	}
	f.Flags = []Flag{
		waive(raised(1, "live", "2026-03-02", "2026-03-02T06:00:00Z", t), Waived, "2026-04-30"),
		waive(raised(2, "soon", "2026-03-02", "2026-03-02T06:00:00Z", t), Waived, "2026-03-23"), // the fifth business day from Monday 16
		waive(raised(3, "over", "2026-03-02", "2026-03-02T06:00:00Z", t), Waived, "2026-03-12"), // nobody has reopened it yet
		waive(raised(4, "back", "2026-03-02", "2026-03-02T06:00:00Z", t), Reopened, "2026-03-11"),
		waive(raised(5, "long ago", "2026-02-02", "2026-02-02T06:00:00Z", t), Reopened, "2026-02-11"),
	}
	if w := f.Figures().Waivers; w.Live != 2 || w.Expiring != 1 || len(w.Lapsed) != 2 {
		t.Errorf("%+v: want 2 live, 1 of them soon over, 2 ended", w)
	}
	pass := func(start, end string, failed bool) WeekPass {
		return WeekPass{instant(t, start), instant(t, end), failed}
	}
	f.Passes = []WeekPass{pass("2026-03-09T06:00:00Z", "2026-03-09T06:01:00Z", false), pass("2026-03-10T06:00:00Z", "2026-03-10T06:01:00Z", true),
		pass("2026-03-10T18:00:00Z", "2026-03-10T18:01:00Z", false)}
	f.Due, f.Notices = 30, []WeekNotice{{NoticeSent}, {NoticeFailed}, {NoticeWaiting}, {NoticeSending}, {NoticeWithdrawn}}
	if r := f.Figures().Runs; r != (Runs{Due: 30, Made: 3, Failed: 1, Quiet: 36 * time.Hour, Notices: 4, Sent: 1, Waiting: 2, Undone: 1}) {
		t.Errorf("%+v", r)
	}
}

// Each thing that asks something of a manager changes the verdict, and says so.
func TestWeekVerdict(t *testing.T) {
	check := func(word WeekWord, why string, change func(*WeekFacts)) {
		t.Helper()
		f := weekOf(t)
		change(f)
		l := NewWeekLog(f, weekOf(t))
		if l.Word != word || !strings.Contains(l.Sentence(), why) {
			t.Errorf("%s: %q, want %s for %q", l.Word, l.Sentence(), word, why)
		}
	}
	check(Holds, "Holds: 10 of 10 expected series-days checked", func(*WeekFacts) {})
	check(MustAct, "nothing was checked", func(f *WeekFacts) { f.Days = nil })
	check(MustAct, "only 8 of 10", func(f *WeekFacts) { f.Days[0].Part = 8 })
	check(Look, "1 of 10 expected series-days have no value", func(f *WeekFacts) { f.Days[0].Part = 9 })
	check(MustAct, "1 flag open for more than 10 business days", func(f *WeekFacts) {
		f.Flags = []Flag{raised(1, "alder", "2026-02-20", "2026-02-23T06:00:00Z", t)}
	})
	check(MustAct, "1 of 2 passes failed", func(f *WeekFacts) { f.Passes = []WeekPass{{Failed: true}, {}} })
	check(MustAct, "1 of 1 message failed for good", func(f *WeekFacts) { f.Notices = []WeekNotice{{NoticeFailed}} })
	check(MustAct, "1 error found by a client", func(f *WeekFacts) {
		f.Acts = []Entry{decided([]uint64{1}, "2026-03-10T06:00:00Z", Erroneous, DataError, "found by client", t)}
	})
	check(MustAct, "1 of 1 series are in the red zone of range own", func(f *WeekFacts) {
		c := Cover{Range: "own", Level: 0.0027, Share: 0.01}
		c.Take("alder", CoverTally{Judged: 250}, CoverTally{Judged: 250, Beyond: 10})
		f.Covers = []Cover{c}
	})
	// 2 beyond 0.27 % of 3,000, where 8.1 are expected: the likelihood ratio by hand is 6.6, p 0.010.
	check(Look, "range own over all groups: too few beyond the 0.27 % line, 2 of 3,000", func(f *WeekFacts) {
		c := Cover{Range: "own", Level: 0.0027, Share: 0.01}
		c.Take("alder", CoverTally{Judged: 3000, Beyond: 2}, CoverTally{Judged: 3000, Beyond: 30})
		f.Covers = []Cover{c}
	})
	check(Holds, "; 1 flag open and undecided.", func(f *WeekFacts) {
		f.Flags = []Flag{raised(1, "alder", "2026-03-13", "2026-03-14T06:00:00Z", t)}
	})
	check(Look, "the settings were changed once", func(f *WeekFacts) { f.Changes = []Change{{}} })
	check(Look, "where 0.3 were expected", func(f *WeekFacts) {
		f.Covers = []Cover{{Range: "own", Of: Return, Level: 0.0027, Share: 0.01, Days: []CoverDay{{day(t, "2026-03-10"), 100, 9, 9}}}}
	})
}

func TestDifferences(t *testing.T) {
	old := Settings{Ranges: []Range{{Name: "own", Of: Return, Window: 60, Scale: Plain, Tail: TailModel{"t", 5}, Breach: Line{Tail: 0.0027}},
		{Name: "hard", Limit: &Limit{-One / 2, One / 2}}, {Name: "gone"}}, Doubtful: 0.002, Assigned: map[string]string{"a": "x", "b": "y"}}
	now := Settings{Ranges: []Range{{Name: "own", Of: Return, Window: 120, Scale: Plain, Tail: TailModel{"t", 5}, Breach: Line{Z: 4}, For: []string{"equity"}},
		{Name: "hard", Limit: &Limit{-One / 4, One / 2}}, {Name: "new"}}, Doubtful: 0.001, Assigned: map[string]string{"a": "z", "c": "y"},
		Groups: []Group{{Name: "g"}}, Events: []Event{{}}}
	want := []string{"range own: for all to [equity]", "range own: window 60 to 120", "range own: breach tail 0.27 % to z 4",
		"range hard: limit [-50.00 %, +50.00 %] to [-25.00 %, +50.00 %]", "range gone taken out", "range new added", "doubtful: 0.2 % to 0.1 %",
		"groups changed: 0 to 1", "3 entries of the register changed (group, reference or currency)", "events: 0 to 1"}
	if got := Differences(&old, &now); !slices.Equal(got, want) {
		t.Errorf("differences\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
	if got := Differences(&old, &old); len(got) != 0 {
		t.Errorf("no difference is %q", got)
	}
}
