package weekly

import (
	"bytes"
	"flag"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
	"unicode"
	"unicode/utf8"

	"strayd/notify"
	"strayd/rules"
	"strayd/stats"
)

var update = flag.Bool("update", false, "write the golden files anew; read what changed before committing them")

// hostile names, each as a file of returns could hold it.
var hostile = map[string]string{
	"plain":   "alder-income",
	"markup":  "</td></table><script>alert(1)</script> <!channel> & \"x\" 'y' {{.}}",
	"mention": "@here #general <@U0000000000>",
	"formula": "=cmd|' /C calc'!A1",
	"left":    "elm\u202egnp.exe\u2066\u200b-core",
	"control": "fir\x00\x1b[31mred\r\nsecond line\x07",
	"broken":  "hazel\xff\xfe-\xc3",
	"hebrew":  "\u05d0\u05dc\u05d5\u05df-5",
	"long":    strings.Repeat("ivy-\u00e9\U0001f333-", 900),
}

func day(y, m, d int) rules.Date {
	date, ok := rules.DateOf(y, m, d)
	if !ok {
		panic("no such day")
	}
	return date
}

func clock(y, m, d, hour int) time.Time {
	return time.Date(y, time.Month(m), d, hour, 0, 0, 0, time.UTC)
}

func breach(ref uint64, series string, date rules.Date) rules.Flag {
	return rules.Flag{Ref: ref, Series: series, Group: "g " + series, Kind: rules.KindBreach, Range: "own", Date: date, RaisedAt: date.Time().Add(30 * time.Hour),
		Return: -41200000000000, Low: rules.Some(-0.0193), High: rules.Some(0.0204), Z: rules.Some(-9.31), Tail: rules.Some(3.1e-6), Log10: rules.Some(-5.5 + float64(ref)/100),
		LooksLike: rules.CauseMissed, Share: rules.Some(0.9), Reference: "index " + series, ReferenceReturn: rules.Some(-0.0021), Residual: rules.Some(-0.0391),
		Standing: rules.Open, Feed: "administrator", File: "nav.csv", Line: 18}
}

// facts is a week in which everything happened to a series of this name; shift is how many weeks earlier.
func facts(series string, shift int) *rules.WeekFacts {
	monday := day(2026, 3, 9) - rules.Date(7*shift)
	back := -7 * 24 * time.Duration(shift) * time.Hour
	span := rules.NewWeekSpan(monday, clock(2026, 3, 16, 7).Add(back), time.UTC)
	f := &rules.WeekFacts{Span: span, Zone: time.UTC, Settings: 3, Head: strings.Repeat("ab", 32), Due: 30 - shift,
		Groups: []rules.Group{{Name: "g " + series, Owner: "o " + series, Reply: time.Hour, Release: &rules.Due{Minutes: 660, Days: 1}, Materiality: 0.005}},
		Feeds:  []rules.Feed{{Name: "administrator", Due: &rules.Due{Minutes: 19*60 + 30}}, {Name: "index"}}}
	for n := range 5 - shift {
		f.Flags = append(f.Flags, breach(uint64(n+1), series, monday+rules.Date(n%5)))
	}
	old := breach(20, series, monday-30)
	old.Kind = rules.KindLimit
	market := breach(21, "", monday+2)
	market.Kind, market.Log10 = rules.KindMarketDay, rules.Num{}
	drift := breach(22, series, monday+1)
	drift.Kind, drift.Log10, drift.Note = rules.KindDrift, rules.Num{}, "note on "+series
	waived := breach(23, series, monday+1)
	waived.Kind, waived.Standing = rules.KindStale, rules.Waived
	waived.Last = &rules.Act{Deed: rules.Waive, By: rules.Person{UID: 1001, Name: "ada " + series}, Until: monday + 9, Note: "until the provider answers " + series}
	f.Flags = append(f.Flags, old, market, drift, waived)
	by := rules.Person{UID: 1002, Name: "bo " + series}
	f.Acts = []rules.Entry{
		{Act: rules.Act{Deed: rules.Decide, By: by, At: monday.Time().Add(50 * time.Hour), Conclusion: rules.Erroneous, Reason: rules.DataError, Note: "found by client " + series}, Refs: []uint64{1}},
		{Act: rules.Act{Deed: rules.Decide, By: by, At: monday.Time().Add(60 * time.Hour), Conclusion: rules.Genuine, Reason: rules.MarketMove, Override: "the index too " + series}, Refs: []uint64{2}},
		{Act: rules.Act{Deed: rules.Decide, By: by, At: monday.Time().Add(90 * time.Hour), Conclusion: rules.Corrected, Value: -2200000000000, Reason: rules.ForDistribution, Note: "ex-date notice of " + series}, Refs: []uint64{3}}}
	f.Arrived = map[uint64]time.Time{1: f.Flags[0].RaisedAt, 3: f.Flags[2].RaisedAt.Add(-90 * time.Minute)}
	f.Flags[0].Standing, f.Flags[0].Decided = rules.Decided, &f.Acts[0].Act
	f.Flags[1].Standing, f.Flags[1].Decided = rules.Decided, &f.Acts[1].Act
	f.Flags[2].Standing, f.Flags[2].Decided = rules.Decided, &f.Acts[2].Act
	f.Changes = []rules.Change{{Number: 3, At: monday.Time().Add(80 * time.Hour), Who: "ada " + series, What: []string{"range own: window 60 to 120", "range " + series + " added"},
		BackRun: []rules.BackRun{{Dates: 250, JudgedOld: 6100, BeyondOld: 29, JudgedNew: 6100, BeyondNew: 21, HeldBefore: true, HeldAfter: true}, {Range: "own", Dates: 250, JudgedOld: 6000, BeyondOld: 17, JudgedNew: 5900, BeyondNew: 11, HeldBefore: true, HeldAfter: true},
			{Range: series, Dates: 250, JudgedNew: 10, HeldAfter: true}}}}
	for n := range 5 {
		f.Days = append(f.Days, rules.WeekDay{Date: monday + rules.Date(n), Portion: rules.Portion{Part: 23 + n%2, Whole: 24},
			Feeds: map[string]rules.Portion{"administrator": {Part: 23, Whole: 24}}})
		f.Files = append(f.Files, rules.WeekFile{Feed: "administrator", At: (monday + rules.Date(n)).Time().Add(19 * time.Hour), Last: monday + rules.Date(n-n%2), Rows: 24})
		f.Passes = append(f.Passes, rules.WeekPass{Started: (monday + rules.Date(n)).Time(), Ended: (monday + rules.Date(n)).Time().Add(time.Minute), Failed: n == 3})
	}
	f.Files = append(f.Files, rules.WeekFile{Feed: "administrator", At: monday.Time().Add(20 * time.Hour), Last: rules.NoDate, Refused: true})
	f.Restated = map[string]rules.Restatements{"administrator": {Count: 2, Largest: 0.0038, Oldest: monday - 4}}
	f.Notices = []rules.WeekNotice{{State: rules.NoticeSent}, {State: rules.NoticeFailed}}
	f.Thin.Series = 24
	for _, n := range []*rules.Naming{&f.Thin.Provisional, &f.Thin.Zero, &f.Thin.Dormant} {
		n.Add(series)
	}
	f.Covers = []rules.Cover{cover("own", "g "+series, series, monday), cover("own", "other", "birch", monday), cover("rest", "other", "birch", monday)}
	return f
}

func cover(name, group, series string, monday rules.Date) rules.Cover {
	c := rules.Cover{Range: name, Of: rules.Return, Group: group, Level: 0.0027, Share: rules.CoverShare}
	for n := range 40 {
		c.Days = append(c.Days, rules.CoverDay{Date: monday - 40 + rules.Date(n), Judged: 12, Outer: n % 7 / 6, Inner: n % 3 / 2})
	}
	c.Days = append(c.Days, rules.CoverDay{Date: monday + 2, Judged: 12, Outer: 3, Inner: 5})
	c.Take(series, rules.CoverTally{Judged: 250, Beyond: 2}, rules.CoverTally{Judged: 250, Beyond: 11, Transitions: stats.Transitions{N00: 234, N01: 4, N10: 4, N11: 7}})
	c.Take("calm", rules.CoverTally{Judged: 250}, rules.CoverTally{Judged: 250, Transitions: stats.Transitions{N00: 249}})
	return c
}

// logs are the logs that every form is tried on: one for each hostile name, and one of a week without anything.
func logs() map[string]*rules.WeekLog {
	out := map[string]*rules.WeekLog{}
	for kind, series := range hostile {
		l := rules.NewWeekLog(facts(series, 0), facts(series, 1))
		l.Made, l.By, l.Program = clock(2026, 3, 16, 7), "ada "+series, "0.1"
		out[kind] = l
	}
	nothing := func() *rules.WeekFacts {
		return &rules.WeekFacts{Span: rules.NewWeekSpan(day(2026, 3, 9), clock(2026, 3, 16, 7), time.UTC), Zone: time.UTC}
	}
	out["nothing"] = rules.NewWeekLog(nothing(), nothing())
	return out
}

func written(t *testing.T, write func(io.Writer, *rules.WeekLog) error, l *rules.WeekLog) string {
	t.Helper()
	var b bytes.Buffer
	if err := write(&b, l); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// Each form is read back, and each figure of one is in the others, the same to the letter.
func TestFormsAgree(t *testing.T) {
	for kind, l := range logs() {
		p, titles := newPage(l), map[string]string{}
		for _, s := range p.Sections {
			titles[s.Key] = s.Title
		}
		fromCSV := ofCSV(t, written(t, CSV, l), titles)
		fromText := ofText(t, written(t, Text, l), p.Sections)
		fromHTML := ofHTML(t, written(t, HTML, l))
		// On the page the sign-off stands on the first sheet.
		slices.SortStableFunc(fromHTML, func(a, b shown) int { return order(p, a) - order(p, b) })
		same(t, kind+": text", fromText, fromCSV)
		same(t, kind+": page", fromHTML, fromCSV)
		if len(fromCSV) < 50 {
			t.Errorf("%s: only %d figures", kind, len(fromCSV))
		}
	}
}

func order(p *page, s shown) int {
	return slices.IndexFunc(p.Sections, func(x *section) bool { return x.Title == s.section })
}

func same(t *testing.T, what string, got, want []shown) {
	t.Helper()
	for i := range min(len(got), len(want)) {
		// Tables are padded and pages collapse blanks, so that runs of blanks in a name may differ.
		got[i].text, want[i].text = strings.Join(strings.Fields(got[i].text), " "), strings.Join(strings.Fields(want[i].text), " ")
		if got[i] != want[i] {
			t.Errorf("%s has %q, CSV %q", what, got[i], want[i])
			return
		}
	}
	if len(got) != len(want) {
		t.Errorf("%s has %d figures, CSV %d", what, len(got), len(want))
	}
}

// What the first sheet and the message say is what the sections say.
func TestFirstSheetAgrees(t *testing.T) {
	for kind, l := range logs() {
		p := newPage(l)
		all := map[figure]bool{}
		for _, s := range p.Sections {
			for _, f := range s.Figures {
				all[f] = true
			}
		}
		if len(p.First) < 9 {
			t.Errorf("%s: %d figures on the first sheet", kind, len(p.First))
		}
		page, text := written(t, HTML, l), written(t, Text, l)
		for _, f := range p.First {
			if !all[f] {
				t.Errorf("%s: %q is in no section", kind, f.Label)
			}
			if n := strings.Count(text, f.Cell.Said()); n < 2 {
				t.Errorf("%s: the text has %q %d times", kind, f.Cell.Said(), n)
			}
		}
		first, _, ok := strings.Cut(page, "</section>\n</section>")
		if !ok || !strings.Contains(first, "Reviewed by") || !strings.Contains(first, "<svg") {
			t.Errorf("%s: the first sheet lacks the sign-off or the drawings", kind)
		}
	}
}

// Nothing in text, page or message can steer a terminal, a browser or a chat, and lines stay short of names that never end.
func TestFormsAreSafe(t *testing.T) {
	for kind, l := range logs() {
		for form, text := range map[string]string{"text": written(t, Text, l), "page": written(t, HTML, l)} {
			if !utf8.ValidString(text) {
				t.Errorf("%s, %s: not UTF-8", kind, form)
			}
			for _, r := range text {
				if r != '\n' && r != ' ' && !unicode.IsPrint(r) {
					t.Errorf("%s, %s: has %U", kind, form, r)
					break
				}
			}
			if len(text) > 120_000 {
				t.Errorf("%s, %s: %d bytes", kind, form, len(text))
			}
		}
		if page := written(t, HTML, l); strings.Contains(page, "<script") || strings.Contains(page, "http") && !strings.Contains(page, "http-equiv") {
			t.Errorf("%s: the page runs or loads something", kind)
		}
		notices := (&notify.Teller{Channels: []rules.Channel{{Name: "desk"}, {Name: "wide", Short: true}, {Name: "not"}}}).Weekly(notify.Weekly{
			At: l.Made, Week: "2026-W11", Channels: []string{"desk", "wide"}, Lines: Lines(l, "/data/weekly/2026-W11.html")})
		if len(notices) != 2 || len(notices[0].Lines) > 8 || len(notices[1].Lines) != 1 || notices[0].Key == notices[1].Key {
			t.Fatalf("%s: notices %+v", kind, notices)
		}
		for n, line := range notices[0].Lines {
			if most := 200; utf8.RuneCountInString(line) > most || n == 0 && utf8.RuneCountInString(line) > 140 {
				t.Errorf("%s: line %d of the message has %d runes", kind, n+1, utf8.RuneCountInString(line))
			}
		}
	}
}

// The same log gives the same bytes.
func TestFormsAreSteady(t *testing.T) {
	one, two := logs(), logs()
	for kind := range one {
		for _, write := range []func(io.Writer, *rules.WeekLog) error{Text, HTML, CSV} {
			if written(t, write, one[kind]) != written(t, write, two[kind]) {
				t.Errorf("%s: two writings differ", kind)
			}
		}
	}
}

// posted are the lines of the message as a channel gets them.
func posted(l *rules.WeekLog) []string {
	t := notify.Teller{Channels: []rules.Channel{{Name: "desk"}}}
	return t.Weekly(notify.Weekly{At: l.Made, Week: "2026-W11", Lines: Lines(l, "/data/weekly/2026-W11.html")})[0].Lines
}

// The golden files are to be read by a person: the page of a hostile name among them.
func TestGolden(t *testing.T) {
	forms := map[string]func(*rules.WeekLog) string{
		"txt":     func(l *rules.WeekLog) string { return written(t, Text, l) },
		"html":    func(l *rules.WeekLog) string { return written(t, HTML, l) },
		"csv":     func(l *rules.WeekLog) string { return written(t, CSV, l) },
		"message": func(l *rules.WeekLog) string { return strings.Join(posted(l), "\n") + "\n" },
	}
	all := logs()
	for _, name := range []string{"plain.txt", "markup.txt", "hebrew.txt", "long.txt", "nothing.txt", "markup.html", "formula.csv", "plain.message", "nothing.message"} {
		kind, form, _ := strings.Cut(name, ".")
		got, file := forms[form](all[kind]), filepath.Join("testdata", name)
		if *update {
			if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
				t.Fatal(err)
			}
			continue
		}
		want, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if got != string(want) {
			t.Errorf("%s differs; read it, then go test ./notify/weekly -update", file)
		}
	}
}
