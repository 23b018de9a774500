package notify

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
	"unicode"
	"unicode/utf8"

	"strayd/rules"
)

var update = flag.Bool("update", false, "write the golden files anew; read what changed before committing them")

// hostile names, each as a file of returns could hold it.
var hostile = map[string]string{
	"plain":   "alder-income",
	"markup":  "<!channel> *birch* & <https://example.invalid|cedar> `x`",
	"mention": "@here #general <@U0000000000>",
	"left":    "elm\u202egnp.exe\u2066\u200b-core",
	"control": "fir\x00\x1b[31mred\r\nsecond line\x07",
	"broken":  "hazel\xff\xfe-\xc3",
	"hebrew":  "\u05d0\u05dc\u05d5\u05df-5",
	"long":    strings.Repeat("ivy-\u00e9\U0001f333-", 900),
	"empty":   " \t ",
}

func berlin(t *testing.T) *time.Location {
	t.Helper()
	z, err := time.LoadLocation("Europe/Berlin")
	if err != nil {
		t.Fatal(err)
	}
	return z
}

func dated(y, m, d int) rules.Date {
	date, ok := rules.DateOf(y, m, d)
	if !ok {
		panic("no such day")
	}
	return date
}

// friday is the valuation date of the golden messages; they are made on its evening, at 18:05 in Berlin.
var (
	friday = dated(2026, 3, 13)
	made   = time.Date(2026, 3, 13, 17, 5, 0, 0, time.UTC)
)

func breachOf(series string, ref uint64) rules.FlagNews {
	return rules.FlagNews{Flag: rules.Flag{Ref: ref, Step: 7, RaisedAt: made, Date: friday, Series: series, Group: "equity",
		Kind: rules.KindBreach, Range: "own", Return: -41200000000000, Low: rules.Some(-0.0193), High: rules.Some(0.0204),
		Z: rules.Some(-9.31), Tail: rules.Some(0.0000031), Log10: rules.Some(-5.5), Standing: rules.Open,
		Feed: "administrator", File: "nav-0313.csv", Line: 18},
		Window: 60, WindowTo: dated(2026, 3, 12), Used: -19300000000000}
}

func limitOf(series string, ref uint64) rules.FlagNews {
	f := breachOf(series, ref)
	f.Kind, f.Range, f.Low, f.High = rules.KindLimit, "hard", rules.Some(-0.04), rules.Some(0.04)
	f.Z, f.Tail, f.Log10, f.Window, f.WindowTo, f.Used = rules.Num{}, rules.Num{}, rules.Num{}, 0, rules.NoDate, rules.Missing
	return f
}

func restatedOf(series string, ref uint64) rules.FlagNews {
	f := limitOf(series, ref)
	f.Kind, f.Range, f.Low, f.High, f.Note = rules.KindRestated, "", rules.Num{}, rules.Num{}, "changed by -420 bp from +8.00 bp"
	return f
}

func aboutFile(kind rules.Kind, name, note string) rules.FlagNews {
	return rules.FlagNews{Flag: rules.Flag{Ref: 31, Step: 7, RaisedAt: made, Date: friday, Kind: kind, Return: rules.Missing,
		Standing: rules.Open, Feed: "administrator", File: name, Note: note}, WindowTo: rules.NoDate, Used: rules.Missing}
}

func gated(name string) rules.FlagNews {
	f := aboutFile(rules.KindRefused, name, "nav-0313.csv: its values are about 100 times their usual size (median of 42 series)")
	f.Gated = true
	return f
}

func newsOf(flags ...rules.FlagNews) rules.News {
	return rules.News{At: made, Feed: "administrator", File: "nav-0313.csv", Rows: 84, Series: 42, Flags: flags}
}

func deskTeller(t *testing.T) *Teller {
	return &Teller{Zone: berlin(t), Channels: []rules.Channel{{Name: "desk", Kind: "slack"}, {Name: "wide", Kind: "slack", Short: true}},
		Groups: []rules.Group{{Name: "equity", Owner: "desk-one", Reply: 2 * time.Hour, Release: &rules.Due{Minutes: 11 * 60, Days: 1}}}}
}

// looking gives a flag a reference and a cause, and takes the names of both from its series.
func looking(f rules.FlagNews, c rules.Cause) rules.FlagNews {
	f.LooksLike, f.Share, f.Implied = c, rules.Some(0.914), rules.Some(-0.0022)
	f.Reference, f.ReferenceReturn, f.Residual = "index-"+f.Series, rules.Some(-0.0021), rules.Some(-0.039)
	f.Group = "shares " + f.Series
	return f
}

func wrongReference(series string) rules.FlagNews {
	f := breachOf(series, 26)
	f.Kind, f.LooksLike, f.Implied, f.Note = rules.KindDoubtful, rules.CauseReference, rules.Some(0.0031), "14 series held against it agree that it is wrong"
	f.Group = ""
	return f
}

func marketOf(group string, still ...string) rules.FlagNews {
	f := breachOf("", 20)
	f.Group, f.Kind, f.Range, f.Low, f.High, f.Tail, f.Log10, f.Line = group, rules.KindMarketDay, "", rules.Num{}, rules.Num{}, rules.Num{}, rules.Num{}, 0
	f.Market = &rules.MarketNews{Reporting: 15, MedianZ: 4.13, NotMoved: still}
	if len(still) > 1 {
		f.Market.NotMoved, f.Market.Otherwise = still[1:], still[:1]
	}
	return f
}

// goldenNews is every kind of message about a series of this name.
func goldenNews(series string) map[string]rules.News {
	reopened := breachOf(series, 12)
	reopened.Standing, reopened.Note = rules.Reopened, "provisional: 12 observations, judged wider until there are 20"
	small := breachOf(series, 12)
	small.Return, small.Used, small.Tail, small.Z = 900000000000, rules.Missing, rules.Some(0.0021), rules.Some(3.2)
	outsize := limitOf(series, 13)
	outsize.Return, outsize.Low, outsize.High, outsize.Note = 9000*rules.One, rules.Num{}, rules.Num{}, "beyond +-100, never enters a window"
	late := aboutFile(rules.KindLate, "", "due by 19:30 with 42 series; 3 without a value: "+series+", birch, cedar")
	var storm []rules.FlagNews
	for i := range 61 {
		f := breachOf(series, uint64(100+i))
		f.Series += string(rune('a'+i%26)) + string(rune('a'+i/26))
		f.Log10.V -= float64(i * 7 % 61)
		if i%4 == 0 {
			f.Group = "group " + string(rune('a'+i/8)) + series
		}
		storm = append(storm, f)
	}
	explained := looking(breachOf(series, 21), rules.CauseMarket)
	explained.Covered = true
	second := explained
	second.Series, second.Ref = "birch-"+series, 22
	third := second
	third.Series, third.Ref = "cedar", 23
	odd := looking(breachOf("elm", 24), rules.CauseSign)
	still := looking(breachOf(series, 25), rules.CauseZero)
	still.Kind, still.Return, still.Used, still.Note = rules.KindStale, 0, 0, "odds of an error 25 to 1, doubt begins at 1 to 2"
	return map[string]rules.News{
		"looks":    newsOf(looking(breachOf(series, 12), rules.CauseMissed)),
		"crowded":  newsOf(looking(breachOf(series, 12), rules.CauseX100), limitOf(series, 13), restatedOf(series, 14)),
		"stale":    newsOf(still),
		"wrong":    newsOf(wrongReference(series)),
		"market":   newsOf(marketOf("shares "+series, series, "birch", "cedar"), explained, second, third, odd, still),
		"moved":    newsOf(marketOf("equity")),
		"breach":   newsOf(breachOf(series, 12)),
		"reopened": newsOf(reopened, limitOf("other", 13)),
		"small":    newsOf(small),
		"limit":    newsOf(limitOf(series, 13)),
		"outsize":  newsOf(outsize),
		"restated": newsOf(restatedOf(series, 14)),
		"all":      newsOf(breachOf(series, 12), limitOf(series, 13), restatedOf(series, 14)),
		"refused":  newsOf(aboutFile(rules.KindRefused, "nav-"+series+".csv", "nav-0313.csv:18:3: value \""+series+"\" is not a number")),
		"gated":    newsOf(gated("nav-" + series + ".csv")),
		"late":     newsOf(late),
		"missing":  newsOf(aboutFile(rules.KindMissing, "nav-0313.csv", "3 series: "+series+", birch, cedar")),
		"digest":   newsOf(append(storm, restatedOf(series+"aa", 200))...),
	}
}

func goldenDaily(series string) rules.DayNews {
	return rules.DayNews{At: made, Date: friday, Checked: 81, Expected: 84, Files: 7, Feeds: 5, FeedsDue: 6, Refused: 1, Breaches: 1,
		Restated: 2, Missing: []string{series, "birch"}, Open: 4, OldestDays: 3, OldestRef: 2409,
		Head: strings.Repeat("0f", 32), Dead: []string{"wide: not_in_channel (3 waiting)"}}
}

func TestGoldenMessages(t *testing.T) {
	for what, series := range hostile {
		teller, text := deskTeller(t), &strings.Builder{}
		for _, kind := range []string{"breach", "reopened", "small", "limit", "outsize", "restated", "all", "refused", "gated", "late", "missing", "digest",
			"looks", "crowded", "stale", "wrong", "market", "moved"} {
			for _, n := range teller.Notices(goldenNews(series)[kind]) {
				note(t, text, kind, n)
				if last := n.Lines[len(n.Lines)-1]; n.Channel == "desk" && n.Kind != rules.KindDigest && !strings.Contains(last, "strayd explain ") {
					t.Errorf("%s: the last line does not say how to answer: %q", kind, last)
				}
			}
		}
		for _, news := range goldenActs(series) {
			for _, n := range teller.Updates(news) {
				note(t, text, string(news.Deed), n)
			}
		}
		for _, n := range teller.Notices(goldenReopened(series)) {
			note(t, text, "open again", n)
		}
		for _, news := range goldenEscalations(series) {
			for _, n := range teller.Escalations(news) {
				note(t, text, string(news.Stage), n)
			}
		}
		for _, n := range teller.Daily(goldenDaily(series)) {
			note(t, text, "daily", n)
		}
		word := Word{At: made, Key: "pass", Lines: []string{"PASS FAILED at 18:05: " + series, "a second line\nwith a break", ""}}
		for _, n := range teller.Word(word) {
			note(t, text, "word", n)
		}
		note(t, text, "test", teller.Test(rules.Channel{Name: series}, made))
		golden(t, what, text.String())
	}
}

// goldenActs are what somebody whose name and words come from elsewhere as well did about flags.
func goldenActs(series string) (out []rules.ActNews) {
	by := rules.Person{UID: 1001, Name: series}
	one := []rules.Flag{breachOf(series, 12).Flag}
	var many []rules.Flag
	for n := range 5 {
		many = append(many, breachOf(series+strings.Repeat("x", n), uint64(12+n)).Flag)
	}
	for _, a := range []struct {
		rules.Act
		flags []rules.Flag
	}{
		{rules.Act{Deed: rules.Acknowledge, Note: series}, one},
		{rules.Act{Deed: rules.Decide, Conclusion: rules.Genuine, Reason: rules.MarketMove, Note: series, Override: series}, one},
		{rules.Act{Deed: rules.Decide, Conclusion: rules.Corrected, Value: 4100000000000, Reason: rules.DataError, Note: "resent"}, many},
		{rules.Act{Deed: rules.Waive, Until: dated(2026, 3, 20), Note: series}, one},
		{rules.Act{Deed: rules.SignOff}, many},
		{rules.Act{Deed: rules.Accept, Note: series}, []rules.Flag{aboutFile(rules.KindRefused, series, "x").Flag}},
	} {
		a.By, a.At, a.Step = by, made, uint32(len(out)+1)
		if a.Deed != rules.Waive {
			a.Until = rules.NoDate
		}
		out = append(out, rules.ActNews{Act: a.Act, Flags: a.flags})
	}
	return out
}

// goldenReopened is a waiver that ran out, a restatement that takes back two flags of one value, and late files.
func goldenReopened(series string) rules.News {
	waived, breach, limit := breachOf("elm", 11).Flag, breachOf(series, 12).Flag, limitOf(series, 13).Flag
	waived.Note = "waived until 2026-03-12, which is over; " + series
	breach.Note, limit.Note = "restated to -0.41 %, for which it would not be raised", "restated to -0.41 %, for which it would not be raised"
	late := aboutFile(rules.KindLate, "", series).Flag
	news := newsOf()
	news.Reopened = []rules.Flag{waived, breach, limit, late}
	for i := range news.Reopened {
		news.Reopened[i].Standing = rules.Reopened
	}
	return news
}

// goldenEscalations are one or many flags at each stage.
func goldenEscalations(series string) (out []rules.EscalationNews) {
	one := []rules.Flag{breachOf(series, 12).Flag}
	var many []rules.Flag
	for n := range 7 {
		many = append(many, breachOf(series+strings.Repeat("x", n), uint64(12+n)).Flag)
	}
	for _, stage := range []rules.Stage{rules.NotAnswered, rules.BeforeHold, rules.Held, rules.StillOpen} {
		for _, flags := range [][]rules.Flag{one, many} {
			out = append(out, rules.EscalationNews{At: made, Group: rules.Group{Name: series}, Flags: flags,
				Step: rules.Step{Stage: stage, At: made, Due: made.Add(30 * time.Minute), Days: 5}})
		}
	}
	return out
}

// note writes a notice to the golden text after holding it to its bounds.
func note(t *testing.T, to *strings.Builder, what string, n rules.Notice) {
	t.Helper()
	bounds(t, what, n)
	to.WriteString("-- " + what + " to " + safe(cut(n.Channel, 40)) + "\n" + strings.Join(n.Lines, "\n") + "\n")
}

func bounds(t *testing.T, what string, n rules.Notice) {
	t.Helper()
	all := strings.Join(n.Lines, "")
	if len(n.Lines) == 0 || len(n.Lines) > 8 || utf8.RuneCountInString(all) > 1500 {
		t.Errorf("%s: %d lines, %d characters", what, len(n.Lines), utf8.RuneCountInString(all))
	}
	for i, l := range n.Lines {
		if most := map[bool]int{true: 140, false: 200}[i == 0]; utf8.RuneCountInString(l) > most || l == "" {
			t.Errorf("%s: line %d has %d characters: %q", what, i, utf8.RuneCountInString(l), l)
		}
	}
	for _, r := range all {
		if r != ' ' && !unicode.IsPrint(r) || r == utf8.RuneError {
			t.Errorf("%s: holds %U", what, r)
		}
	}
	if n.Key == "" || n.State != rules.NoticeWaiting || n.Made.IsZero() || n.Next.Before(n.Made) {
		t.Errorf("%s: not fit for the outbox: %+v", what, n)
	}
}

func golden(t *testing.T, what, got string) {
	t.Helper()
	file := filepath.Join("testdata", what+".txt")
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		t.Errorf("%s differs; got:\n%s", file, got)
	}
}
