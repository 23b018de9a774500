package notify

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

func channelsOf(ns []rules.Notice) string {
	var words []string
	for _, n := range ns {
		words = append(words, fmt.Sprint(n.Channel, ":", n.Kind, n.Refs))
	}
	return strings.Join(words, " ")
}

func TestWhichChannelTakesWhat(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{
		{Name: "all"},
		{Name: "equity", For: []string{"equity"}},
		{Name: "bonds", For: []string{"bonds", "cash"}},
		{Name: "limits", Kinds: []rules.Kind{rules.KindLimit, rules.KindRefused}},
		{Name: "both", For: []string{"bonds"}, Kinds: []rules.Kind{rules.KindLimit}},
	}}
	check := func(kind rules.Kind, series, group, want string) {
		t.Helper()
		f := breachOf(series, 1)
		f.Kind, f.Group = kind, group
		var got []string
		for _, n := range teller.Notices(newsOf(f)) {
			got = append(got, n.Channel)
		}
		equal(t, fmt.Sprintf("%s of %q in %q", kind, series, group), strings.Join(got, " "), want)
		if series != "" || wholeFeed(kind) {
			equal(t, "takers", strings.Join(teller.Takers(kind, group), " "), want)
		}
	}
	check(rules.KindBreach, "alder", "equity", "all equity")
	check(rules.KindBreach, "elm", "cash", "all bonds")
	check(rules.KindLimit, "elm", "bonds", "all bonds limits both")
	check(rules.KindBreach, "fir", "", "all") // of no group
	// what is about neither a series nor a group concerns whoever takes the kind
	check(rules.KindRefused, "", "", "all equity bonds limits")
	check(rules.KindLate, "", "", "all equity bonds")
	// a market day is a group's
	check(rules.KindMarketDay, "", "bonds", "all bonds")
}

func TestWhatAsksNothingIsNotTold(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk"}}}
	for _, s := range rules.Standings {
		f := breachOf("alder", 1)
		f.Standing = s
		if got := len(teller.Notices(newsOf(f))) == 1; got != s.Asks() {
			t.Errorf("%s: told %v", s, got)
		}
	}
}

func TestFlagsOfOneSeriesAndDateAreOneMessage(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk"}}}
	other := limitOf("birch", 5)
	otherDay := breachOf("alder", 6)
	otherDay.Date++
	ns := teller.Notices(newsOf(limitOf("alder", 3), restatedOf("alder", 4), breachOf("alder", 2), other, otherDay,
		aboutFile(rules.KindRefused, "a.csv", "x"), aboutFile(rules.KindMissing, "b.csv", "y")))
	equal(t, "notices", channelsOf(ns), "desk:breach[2 3 4] desk:limit[5] desk:breach[6] desk:refused[31] desk:missing[31]")
}

func TestStorm(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk"}, {Name: "bonds", For: []string{"bonds"}}}}
	news := newsOf()
	for i := range 9 {
		f := breachOf(fmt.Sprint("s", i), uint64(i+1))
		if i < 3 {
			f.Group = "bonds"
		}
		news.Flags = append(news.Flags, f)
	}
	// eight messages come singly, however many flags; the ninth makes a digest, for the channel that would get it
	eight := news
	eight.Flags = append(slices.Clone(news.Flags[:8]), limitOf("s7", 10))
	equal(t, "eight", len(teller.Notices(eight)), 8+3)
	equal(t, "nine", channelsOf(teller.Notices(news)),
		"desk:digest[1 2 3 4 5 6 7 8 9] bonds:breach[1] bonds:breach[2] bonds:breach[3]")
}

// The worst of a digest are those with the smallest tails; figures beyond every tail come before the rest.
func TestDigestNamesTheWorst(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk"}}}
	var flags []rules.FlagNews
	for i := range 20 {
		f := breachOf(fmt.Sprintf("s%02d", i), uint64(i+1))
		f.Log10.V = -float64(3 + (i*7)%20) // 7 and 20 have no common divisor: each of -3 to -22 once
		flags = append(flags, f)
	}
	big := limitOf("big", 30)
	big.Return = 5 * rules.One
	flags = append(flags, limitOf("small", 31), big)
	n := teller.Notices(newsOf(flags...))[0]
	var named []string
	for _, l := range n.Lines[2:6] {
		named = append(named, strings.Fields(l)[0])
	}
	equal(t, "worst", named, []string{"s17", "s14", "s11", "s08"}) // 7 x 17 = 119, 19 beyond a multiple of 20; then 18, 17, 16
	equal(t, "more", n.Lines[6], "and 18 more: strayd flags --date 2026-03-13")
	later := breachOf("later", 40)
	later.Date += 3
	n = teller.Notices(newsOf(append(flags[20:], append(flags[:18], later)...)...))[0]
	equal(t, "several dates", n.Lines[6], "and 17 more: strayd flags --from 2026-03-13 --to 2026-03-16")
	equal(t, "date", n.Date, rules.NoDate)
	if !strings.HasPrefix(n.Lines[0], "DIGEST of 21 flags from Fri 2026-03-13 to Mon 2026-03-16: breach 19, limit 2") {
		t.Errorf("head %q", n.Lines[0])
	}
	if gravity(event{&big}) >= gravity(event{&flags[20]}) {
		t.Error("of two without a tail, the larger is not the graver")
	}
}

func TestKeys(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk"}, {Name: "other"}}}
	seen := map[string]string{}
	add := func(what string, news rules.News, fresh bool) {
		t.Helper()
		for _, n := range teller.Notices(news) {
			known, ok := seen[n.Key]
			if ok == fresh {
				t.Errorf("%s to %s: key known %v (%s)", what, n.Channel, ok, known)
			}
			seen[n.Key] = what
		}
	}
	change := func(f rules.FlagNews, by func(*rules.FlagNews)) rules.News { by(&f); return newsOf(f) }
	b := breachOf("alder", 12)
	add("first", newsOf(b), true)
	add("again", newsOf(b), false)
	again := newsOf(b)
	again.At = again.At.Add(time.Hour)
	add("again, an hour later", again, false)
	add("another date", change(b, func(f *rules.FlagNews) { f.Date++ }), true)
	add("another series", change(b, func(f *rules.FlagNews) { f.Series = "birch" }), true)
	add("another kind", newsOf(limitOf("alder", 12)), true)
	add("restated", change(b, func(f *rules.FlagNews) { f.Step, f.Return = 8, f.Return+1 }), true)
	add("restated back", change(b, func(f *rules.FlagNews) { f.Step = 9 }), true)
	l := aboutFile(rules.KindLate, "", "3 missing")
	add("late", newsOf(l), true)
	add("late, told in another step", change(l, func(f *rules.FlagNews) { f.Step, f.Note = 11, "2 missing" }), false)
	r := aboutFile(rules.KindRefused, "a.csv", "row 3")
	add("refused", newsOf(r), true)
	add("refused for another row", change(r, func(f *rules.FlagNews) { f.Note = "row 4" }), true)
	storm := newsOf()
	for i := range 20 {
		storm.Flags = append(storm.Flags, breachOf(fmt.Sprint("storm", i), uint64(i)))
	}
	add("storm", storm, true)
	add("storm again", storm, false)
	storm.Flags = storm.Flags[1:]
	add("another storm", storm, true)

	day := rules.DayNews{At: made, Date: friday}
	daily := teller.Daily(day)[0].Key
	day.At, day.Checked = day.At.Add(5*time.Hour), 3
	equal(t, "daily of the same day", teller.Daily(day)[0].Key, daily)
	day.At = day.At.Add(5 * time.Hour)
	if teller.Daily(day)[0].Key == daily {
		t.Error("the next day's line has the same key, though no newer file came")
	}
	if teller.Test(teller.Channels[0], made).Key == teller.Test(teller.Channels[0], made.Add(1)).Key {
		t.Error("two tests have one key")
	}
	if key("ab", "c") == key("a", "bc") {
		t.Error("keys run together")
	}
}

// Whatever the news: each flag that a channel takes is in exactly one of its notices, and no other is.
func TestNothingIsDroppedOrToldTwice(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "all"}, {Name: "one", For: []string{"g1"}, Short: true},
		{Name: "few", Kinds: []rules.Kind{rules.KindLimit, rules.KindLate}}}}
	for seed := range uint64(300) {
		r := rand.New(rand.NewPCG(seed, 2))
		news := newsOf()
		for i := range r.IntN(40) {
			f := breachOf(fmt.Sprint("s", r.IntN(12)), uint64(i+1))
			f.Kind, f.Date = rules.Kinds[r.IntN(len(rules.Kinds))], friday+rules.Date(r.IntN(2))
			f.Group, f.Standing = fmt.Sprint("g", r.IntN(3)), rules.Standings[r.IntN(len(rules.Standings))]
			if wholeFeed(f.Kind) {
				f.Series, f.Group = "", ""
			}
			news.Flags = append(news.Flags, f)
		}
		notices := teller.Notices(news)
		for _, c := range teller.Channels {
			var told, want []uint64
			for _, n := range notices {
				bounds(t, fmt.Sprint("seed ", seed), n)
				if n.Channel == c.Name {
					told = append(told, n.Refs...)
				}
			}
			for _, f := range news.Flags {
				if f.Standing.Asks() && (len(c.For) == 0 || f.Group == "g1" || f.Series == "") && (len(c.Kinds) == 0 || slices.Contains(c.Kinds, f.Kind)) {
					want = append(want, f.Ref)
				}
			}
			slices.Sort(told)
			equal(t, fmt.Sprintf("seed %d, channel %s", seed, c.Name), told, want)
		}
	}
}

func TestHeldUntilTheHours(t *testing.T) {
	teller := deskTeller(t)
	teller.Channels = []rules.Channel{{Name: "desk", From: 8 * 60, To: 18 * 60}} // made at 18:05 in Berlin
	n := teller.Notices(newsOf(breachOf("alder", 12)))[0]
	equal(t, "next", n.Next.Format(time.RFC3339), "2026-03-14T07:00:00Z")
	equal(t, "reply by counts from then", n.Lines[4], "For desk-one; reply by 10:00 CET; holds back the release of equity at Mon 2026-03-16 11:00 CET")
	equal(t, "a test is not held", teller.Test(teller.Channels[0], made).Next, made)
	equal(t, "daily", teller.Daily(rules.DayNews{At: made})[0].Next.Equal(n.Next), true)
}

func TestOwnersAndReleases(t *testing.T) {
	teller := deskTeller(t)
	line := func(f rules.FlagNews, read time.Time) string { return teller.ownerLine(&f, read) }
	f := breachOf("alder", 1)
	equal(t, "passed", line(f, made.Add(72*time.Hour)),
		"For desk-one; reply by 20:05 CET; the release of equity was at 11:00 CET") // Monday, after 11:00
	teller.Owner = func(series string) string { return map[string]string{"alder": "anna"}[series] }
	equal(t, "the register's", strings.HasPrefix(line(f, made), "For anna; "), true)
	f.Series = "birch"
	equal(t, "the group's", strings.HasPrefix(line(f, made), "For desk-one; "), true)
	f.Group = "none such"
	equal(t, "nobody", line(f, made), "")
	// Friday plus one business day is Monday
	due := rules.Due{Minutes: 690, Days: 1, Timezone: "America/New_York"}
	equal(t, "deadline", teller.dueAt(due, friday).Format(time.RFC3339), "2026-03-16T11:30:00-04:00")
	due.Timezone = ""
	equal(t, "in the teller's zone", teller.dueAt(due, friday).Format(time.RFC3339), "2026-03-16T11:30:00+01:00")
}

func TestWords(t *testing.T) {
	teller := deskTeller(t)
	ns := teller.Word(Word{At: made, Key: "dead desk", But: "desk", Lines: []string{"first", "second"}})
	equal(t, "to", channelsOf(ns), "wide:word[]")
	equal(t, "short form", ns[0].Lines, []string{"first"})
	equal(t, "same key", teller.Word(Word{At: made.Add(1), Key: "dead desk"})[1].Key, ns[0].Key)
}

func TestFigures(t *testing.T) {
	for v, want := range map[float64]string{0: "+0.00 %", 0.0412: "+4.12 %", -0.0412: "-4.12 %", 0.001: "+0.10 %", 0.00099: "+9.90 bp",
		-0.00000001: "-0.00 bp", 12: "+1200.00 %"} {
		equal(t, fmt.Sprint(v), rules.InPercent(v), want)
	}
	for tail, want := range map[float64]string{1: "about every day", 0.5: "about once in 2 days", 0.0027: "about once in 370 days",
		1.0 / 4999: "about once in 4,999 days", 1.0 / 5000: "rarer than 1 in 5,000", 5e-324: "rarer than 1 in 5,000"} {
		equal(t, fmt.Sprint(tail), rules.OnceIn(tail), want)
	}
	for n, want := range map[int]string{0: "0 series", 1: "1 series", 1234567: "1,234,567 series"} {
		equal(t, fmt.Sprint(n), rules.Counted(n, "series"), want)
	}
	equal(t, "one side", rules.Between(rules.Some(-0.01), rules.Num{})+", "+rules.Between(rules.Num{}, rules.Some(0.01)), "-1.00 % or above, +1.00 % or below")
}

func TestLongNotesAreWrapped(t *testing.T) {
	note := strings.Repeat("series-name, ", 100)
	n := (&Teller{Channels: []rules.Channel{{Name: "desk"}}}).Notices(newsOf(aboutFile(rules.KindMissing, "a.csv", note)))[0]
	bounds(t, "wrapped", n)
	equal(t, "lines", len(n.Lines), 6) // head, three of names, file, answer
	equal(t, "broken at a name", strings.HasSuffix(n.Lines[1], "series-name,"), true)
	equal(t, "cut", strings.HasSuffix(n.Lines[3], "..."), true)
}

func FuzzSafe(f *testing.F) {
	for _, s := range hostile {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		teller := &Teller{Channels: []rules.Channel{{Name: "desk"}}}
		for _, kind := range []string{"all", "refused", "late", "digest"} {
			for _, n := range teller.Notices(goldenNews(s)[kind]) {
				bounds(t, kind, n)
			}
		}
	})
}
