package main

import (
	"cmp"
	"fmt"
	"io"
	"log/slog"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher/ledger"
	"strayd/watcher/schedule"
)

// figureOf finds one figure of the weekly log's CSV.
func figureOf(t *testing.T, rows []record, section, table, subject, figure string) record {
	t.Helper()
	for _, r := range rows {
		if r["section"] == section && r["table"] == table && r["subject"] == subject && r["figure"] == figure {
			return r
		}
	}
	t.Fatalf("the log has no figure %q of %q in %s %s", figure, subject, section, table)
	return nil
}

// The open index series through files, pass and log against R: the count below the lower 1 % line over the last 250 scored rows, and its
// zone (testdata/reference/ref/counts.csv).
func TestWeeklyAgainstReference(t *testing.T) {
	f := newFolder(t, `ranges:
  - {name: below, window: 250, tail: normal, predictive: false, pending: keep, side: lower, watch: {tail: 5%}, breach: {tail: 1%}}
`)
	last := ""
	want := map[string]record{}
	for _, r := range reference(t, "ref/counts.csv") {
		want[r["series"]] = r
	}
	for _, series := range openSeries[:4] {
		rows := reference(t, "data/"+series+".csv")
		dates := openDates(t, rows)
		var text strings.Builder
		text.WriteString("date,series,return\n")
		for i, r := range rows {
			fmt.Fprintf(&text, "%s,%s,%s\n", dates[i], series, r["ret"])
		}
		f.write("inbox/"+series+".csv", text.String())
		last = dates[len(dates)-1]
	}
	d, _ := rules.ParseDate(last)
	now := (rules.MondayOf(d) + 7).String() + "T07:00:00Z"
	f.must("pass", "--settled", "--now", now)
	rows := f.list("weekly", "--now", now)
	zones, beyond := map[string]int{}, 0
	for _, series := range openSeries[:4] {
		r := want[series]
		zones[r["zone"]]++
		n := int(r.number(t, "last250_lower1pct"))
		beyond += n
		if n > 4 {
			got := figureOf(t, rows, "coverage", "series", series, "beyond, of judged")
			if got["value"] != strconv.Itoa(n) || got["of"] != "250" {
				t.Errorf("%s: %s of %s beyond, want %d of 250", series, got["value"], got["of"], n)
			}
			if zone := figureOf(t, rows, "coverage", "series", series, "zone"); zone["value"] != r["zone"] {
				t.Errorf("%s: zone %s, want %s", series, zone["value"], r["zone"])
			}
		}
	}
	for _, zone := range []string{"green", "yellow", "red"} {
		if got := figureOf(t, rows, "coverage", "zone", "below, all", zone); got["value"] != strconv.Itoa(zones[zone]) || got["of"] != "4" {
			t.Errorf("%s of %s series are %s, want %d", got["value"], got["of"], zone, zones[zone])
		}
	}
	pool := figureOf(t, rows, "coverage", "pool", "below, all", "beyond, of judged")
	if pool["value"] != strconv.Itoa(beyond) || pool["of"] != "1000" {
		t.Errorf("%s of %s beyond, want %d of 1000", pool["value"], pool["of"], beyond)
	}
	if zones["yellow"] != 2 || zones["green"] != 2 {
		t.Errorf("the reference has zones %v: the test sees too little", zones)
	}
}

// weeklyRanges are ranges of every kind; the inner line of each is at 1 %, but for rank, whose window cannot speak of so small a share.
const weeklyRanges = `groups:
  - {name: odd, series: ["series-*[13579]"], reference: none}
  - {name: even, series: ["series-*[02468]"], reference: peers}
ranges:
  - {name: own, watch: {tail: 1%}, breach: {tail: 0.27%}}
  - {name: lower, for: [odd], window: 20, side: lower, watch: {tail: 1%}, breach: {tail: 0.5%}}
  - {name: weighted, scale: weighted, window: 30, watch: {tail: 1%}, breach: {z: 4}}
  - {name: mad, for: [even], scale: mad, window: 40, watch: {tail: 1%}, breach: {tail: 0.1%}}
  - {name: rank, window: 60, tail: rank, watch: {tail: 10%}, breach: {tail: 5%}}
  - {name: rest, of: residual, watch: {tail: 1%}, breach: {tail: 0.27%}}
`

// pooled is what history says of one range and group: the newest 250 judged values of every series.
type pooled struct{ judged, beyond, inner int }

// The log judges by running windows; history recomputes each verdict from its definition. Both count alike, on invented books with all
// that books bring.
func TestWeeklyAgainstHistory(t *testing.T) {
	for seed := range uint64(3) {
		b := invent(seed + 40)
		f := newFolder(t, weeklyRanges)
		var text strings.Builder
		text.WriteString("date,series,return\n")
		for _, r := range b.rows {
			fmt.Fprintf(&text, "%s,%s,%s\n", r.date, r.series, r.value)
		}
		monday := rules.MondayOf(b.dates[len(b.dates)-1])
		now := (monday + 7).String() + "T07:00:00Z"
		f.write("inbox/book.csv", text.String())
		f.must("pass", "--settled", "--now", now)
		got := f.list("weekly", "--now", now)
		for key, want := range f.pooledByHistory(b) {
			inner := figureOf(t, got, "coverage", "pool", key, "beyond, of judged")
			outer := figureOf(t, got, "coverage", "breach", key, "beyond, of judged")
			if inner["value"] != strconv.Itoa(want.inner) || inner["of"] != strconv.Itoa(want.judged) || outer["value"] != strconv.Itoa(want.beyond) {
				t.Errorf("seed %d, %s: the log has %s and %s beyond of %s judged, history %+v", seed+40, key, inner["value"], outer["value"], inner["of"], want)
			}
		}
	}
}

func (f *folder) pooledByHistory(b *invented) map[string]pooled {
	names := map[string]bool{}
	for _, r := range b.rows {
		names[r.series] = true
	}
	out := map[string]pooled{}
	for name := range names {
		byRange := map[string][]record{}
		for _, r := range f.list("history", name) {
			if r["verdict"] != string(rules.NotJudged) {
				byRange[r["range"]] = append(byRange[r["range"]], r)
			}
		}
		group := "even"
		if (name[len(name)-1]-'0')%2 == 1 {
			group = "odd"
		}
		for rng, rows := range byRange {
			share := 0.01
			if rng == "rank" {
				share = 0.1
			}
			p := out[rng+", "+group]
			rows = rows[max(0, len(rows)-rules.CoverDates):]
			p.judged += len(rows)
			for _, r := range rows {
				if r["verdict"] == string(rules.Breach) {
					p.beyond++
				}
				if r.number(f.t, "tail") < share {
					p.inner++
				}
			}
			out[rng+", "+group] = p
		}
	}
	for key, p := range out { // a range of one group has no second line for it
		rng, _, _ := strings.Cut(key, ", ")
		if rng == "lower" || rng == "mad" {
			delete(out, key)
			out[rng+", all"] = p
		}
	}
	return out
}

// A week is kept and posted once, whoever asks how often; what is kept stays as it was.
func TestWeeklyKeepsAndPostsOnce(t *testing.T) {
	f := newFolder(t, "ranges:\n  - {name: own}\nchannels:\n  - {name: desk, console: {}}\n  - {name: other, console: {}}\nweekly: {channels: [desk]}\n")
	f.write("inbox/a.csv", "date,series,return\n2026-03-09,alder,0.01\n2026-03-10,alder,0.02\n")
	f.must("pass", "--settled", "--now", "2026-03-11T07:00:00Z")
	first := f.must("weekly", "--send", "--now", "2026-03-16T07:00:00Z")
	if n := strings.Count(first, "WEEKLY LOG 2026-W11"); n != 1 {
		t.Errorf("the message was printed %d times, want once, on one of two channels:\n%s", n, first)
	}
	kept := filepath.Join(f.path, "weekly")
	before := map[string]string{}
	for _, ending := range []string{"html", "txt", "csv"} {
		text, err := os.ReadFile(filepath.Join(kept, "2026-W11."+ending))
		if err != nil {
			t.Fatal(err)
		}
		before[ending] = string(text)
	}
	again := f.must("weekly", "2026-W11", "--send", "--now", "2026-03-16T09:00:00Z")
	if strings.Contains(again, "WEEKLY LOG") {
		t.Errorf("the week was posted again:\n%s", again)
	}
	for ending, want := range before {
		if text, err := os.ReadFile(filepath.Join(kept, "2026-W11."+ending)); err != nil || string(text) != want {
			t.Errorf("%s was written again (%v)", ending, err)
		}
	}
	entries, err := os.ReadDir(kept)
	if err != nil || len(entries) != 3 {
		t.Errorf("%d files kept (%v), want 3: no temporary one is left", len(entries), err)
	}
	if out := f.must("weekly", "2026-W10", "--send", "--now", "2026-03-16T09:00:00Z"); !strings.Contains(out, "WEEKLY LOG 2026-W10") {
		t.Errorf("another week is not posted:\n%s", out)
	}
}

// From the end of the Monday after, the figures of a week never change, whatever is decided or restated later.
func TestWeeklyStands(t *testing.T) {
	f := newFolder(t, "ranges:\n  - {name: own, window: 20}\n  - {name: hard, limit: [-10%, 10%]}\n")
	var text strings.Builder
	text.WriteString("date,series,return\n")
	monday, _ := rules.ParseDate("2026-03-09")
	for d := monday - 70; d < monday+4; d++ {
		if rules.Weekdays(d-1, d) == 1 {
			fmt.Fprintf(&text, "%s,alder,0.00%d\n", d, 1+int(d)%7)
		}
	}
	f.write("inbox/a.csv", text.String())
	f.must("pass", "--settled", "--now", "2026-03-13T06:00:00Z")
	f.write("inbox/b.csv", "date,series,return\n2026-03-13,alder,0.5\n")
	f.must("pass", "--settled", "--now", "2026-03-14T06:00:00Z")
	figures := func(now string) string {
		var out []string
		for _, r := range f.list("weekly", "2026-W11", "--now", now) {
			if r["section"] != "sign-off" {
				out = append(out, fmt.Sprint(r["section"], r["table"], r["subject"], r["figure"], r["shown"]))
			}
		}
		return strings.Join(out, "\n")
	}
	stood := figures("2026-03-17T00:00:00Z")
	if !strings.Contains(stood, "Flags that ask something2 (last week 0)") {
		t.Errorf("two flags should be open:\n%s", stood)
	}
	f.write("inbox/c.csv", "date,series,return\n2026-03-12,alder,0.09\n2026-03-13,alder,0.002\n2026-03-16,alder,0.001\n")
	f.must("pass", "--settled", "--now", "2026-03-18T06:00:00Z")
	f.must("decide", "1", "error", "--reason", "data-error", "--note", "a typing error", "--now", "2026-03-18T07:00:00Z")
	if got := figures("2026-05-01T00:00:00Z"); got != stood {
		t.Errorf("the week reads otherwise later:\n%s\nbefore:\n%s", diff(got, stood), diff(stood, got))
	}
}

// diff lists the lines of a that b lacks.
func diff(a, b string) string {
	have := strings.Split(b, "\n")
	var out []string
	for _, line := range strings.Split(a, "\n") {
		if !slices.Contains(have, line) {
			out = append(out, line)
		}
	}
	return strings.Join(out, "\n")
}

func TestWeeklyUsage(t *testing.T) {
	f := newFolder(t, "ranges:\n  - {name: own}\n")
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"weekly", "2026-W54"}, "week \"2026-W54\": need one such as 2026-W11, or a date in it"},
		{[]string{"weekly", "--format", "pdf"}, "--format \"pdf\": need text, html or csv"},
		{[]string{"weekly", "2030-W01", "--now", "2026-03-16"}, "week 2030-W01 has not begun"},
		{[]string{"weekly", "2026-W11", "2026-W12"}, "one argument too many"},
	} {
		if code, _, errs := f.try(c.args...); code != exitUsage || !strings.Contains(errs, c.want) {
			t.Errorf("%q: exit code %d, %s", c.args, code, errs)
		}
	}
	// A ledger without anything has a log too, and says so.
	if out := f.must("weekly", "--now", "2026-03-16T07:00:00Z"); !strings.Contains(out, "Act: nothing was checked") {
		t.Errorf("an empty ledger: %s", out[:min(len(out), cmp.Or(len(out), 300))])
	}
}

// The daemon's schedule makes, keeps and posts the log; a slot that comes again, as after a crash, posts nothing again.
func TestWeeklyBySchedule(t *testing.T) {
	f := newFolder(t, "ranges:\n  - {name: own}\nchannels:\n  - {name: desk, console: {}}\nweekly: {schedule: \"30 7 * * mon\"}\n")
	f.write("inbox/a.csv", "date,series,return\n2026-03-09,alder,0.01\n2026-03-10,alder,0.02\n")
	f.must("pass", "--settled", "--now", "2026-03-11T07:00:00Z")
	a := &app{ctx: t.Context(), out: io.Discard, err: io.Discard, configPath: filepath.Join(f.path, "strayd.yaml")}
	c, err := a.load()
	if err != nil {
		t.Fatal(err)
	}
	l, err := openLedger(c, ledger.ReadWrite)
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close() //nolint:errcheck // the test is over
	d := &daemon{log: slog.New(slog.DiscardHandler), ledger: l, program: a, heart: make(chan struct{}, 1), passing: make(chan struct{}, 1)}
	d.beats.begun = make(chan struct{})
	if d.setup, err = d.prepare(c); err != nil {
		t.Fatal(err)
	}
	at := slices.IndexFunc(d.setup.jobs, func(j schedule.Job) bool { return j.Name == weeklyJob })
	if at < 0 {
		t.Fatal("no job makes the weekly log")
	}
	job, slot := d.setup.jobs[at], time.Date(2026, 3, 16, 7, 30, 0, 0, time.UTC)
	if next := job.When.Next(slot.AddDate(0, 0, -6)); !next.Equal(slot) {
		t.Errorf("the job's slot is %s, want %s", next, slot)
	}
	for range 2 {
		if err := job.Run(t.Context(), slot); err != nil {
			t.Fatal(err)
		}
	}
	posted := 0
	if err := l.Notices(func(n rules.Notice) bool {
		if n.Kind == rules.KindWeekly {
			posted++
			if !strings.Contains(n.Lines[0], "2026-W11") {
				t.Errorf("the message begins %q", n.Lines[0])
			}
		}
		return true
	}); err != nil || posted != 1 {
		t.Errorf("%d messages (%v), want 1", posted, err)
	}
	if _, err := os.Stat(filepath.Join(f.path, "weekly", "2026-W11.html")); err != nil {
		t.Error(err)
	}
}
