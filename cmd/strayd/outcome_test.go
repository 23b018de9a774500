package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"maps"
	"os"
	"runtime"
	"slices"
	"strings"
	"testing"
)

// What a book came to, whatever its files were.
type outcome struct {
	history map[string]string
	flags   string
}

// outcome prints every series' history and every flag without what depends on the files: refs, times, files, lines, and standings,
// which follow what was a first load.
func (f *folder) outcome(o *oracle) outcome {
	f.t.Helper()
	out := outcome{history: map[string]string{}}
	for _, series := range o.names() {
		out.history[series] = f.must("history", series, "--format", "csv")
	}
	var flags strings.Builder
	for _, r := range f.list("flags", "--all") {
		if r["kind"] == "missing" { // about a file, and files differ here
			continue
		}
		for _, column := range []string{"ref", "raised_at", "file", "line", "standing"} {
			delete(r, column)
		}
		for _, column := range slices.Sorted(maps.Keys(r)) {
			fmt.Fprintf(&flags, "%s=%s ", column, r[column])
		}
		flags.WriteString("\n")
	}
	out.flags = flags.String()
	return out
}

func (a outcome) same(t *testing.T, what string, b outcome) {
	t.Helper()
	for series := range a.history {
		if a.history[series] != b.history[series] {
			t.Errorf("%s: the history of %s differs: %s", what, series, firstDifference(a.history[series], b.history[series]))
			return
		}
	}
	if a.flags != b.flags {
		t.Errorf("%s: the flags differ: %s", what, firstDifference(a.flags, b.flags))
	}
}

func firstDifference(a, b string) string {
	x, y := strings.Split(a, "\n"), strings.Split(b, "\n")
	for i := range min(len(x), len(y)) {
		if x[i] != y[i] {
			return fmt.Sprintf("line %d:\n%s\n%s", i+1, x[i], y[i])
		}
	}
	return fmt.Sprintf("%d lines against %d", len(x), len(y))
}

// The same content in order gives the same bytes, however it is cut into files and however many workers judge it.
func TestSplitIntoFilesDoesNotMatter(t *testing.T) {
	before := runtime.GOMAXPROCS(0)
	defer runtime.GOMAXPROCS(before)
	for seed := range seeds() {
		b := invent(seed)
		ranges := inventRanges(b.random)
		o := newOracle(ranges)
		for _, c := range b.rows {
			o.series[c.series] = nil // only its names are needed
		}
		var first outcome
		for n, split := range []struct {
			what    string
			workers int
			files   [][]bookRow
		}{{"one file", 1, [][]bookRow{b.rows}}, {"one file, 5 workers", 5, [][]bookRow{b.rows}}, {"chunks", 3, b.chunks()}, {"a file a date", 2, b.daily()}} {
			runtime.GOMAXPROCS(split.workers)
			f := newFolder(t, rangesText(ranges))
			f.deliver(b, split.files)
			got := f.outcome(o)
			if n == 0 {
				first = got
			}
			first.same(t, fmt.Sprintf("seed %d, %s", seed, split.what), got)
		}
		if !strings.Contains(first.flags, "breach") {
			t.Errorf("seed %d has no flags to compare", seed)
		}
	}
}

// A rerun changes nothing and raises nothing, also when the same files come under other names.
func TestRerunChangesNothing(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f, o := newFolder(t, rangesText(ranges)), newOracle(ranges)
		files := b.rough()[:20]
		f.deliver(b, files)
		for _, rows := range files {
			o.take(rows)
		}
		before, flags := f.outcome(o), f.must("flags", "--all", "--format", "csv")
		ledger, err := os.ReadFile(f.path + "/ledger.db")
		if err != nil {
			t.Fatal(err)
		}
		for n, rows := range files {
			f.write(fmt.Sprintf("inbox/again-%04d.csv", n), fileText(rows))
		}
		for range 2 {
			if out := f.must("pass", "--settled"); !strings.Contains(out, "0 files accepted") {
				t.Errorf("a rerun says %q", out)
			}
		}
		before.same(t, "rerun", f.outcome(o))
		if again := f.must("flags", "--all", "--format", "csv"); again != flags {
			t.Errorf("flags after a rerun differ: %s", firstDifference(flags, again))
		}
		// the run record and the stamps may be written, the data may not grow
		if now, err := os.Stat(f.path + "/ledger.db"); err != nil || now.Size() > int64(len(ledger))+1<<16 {
			t.Errorf("the ledger grew from %d to %d bytes, %v", len(ledger), now.Size(), err)
		}
	})
}

// explanation is the JSON of `explain REF` without what may grow: the versions, and what the window holds of the value today.
func (f *folder) explanation(ref string) string {
	f.t.Helper()
	var figures map[string]any
	d := json.NewDecoder(bytes.NewReader([]byte(f.must("explain", ref, "--format", "json"))))
	d.UseNumber()
	if err := d.Decode(&figures); err != nil {
		f.t.Fatal(err)
	}
	delete(figures, "versions")
	delete(figures, "used")
	delete(figures, "standings")
	text, err := json.Marshal(figures)
	if err != nil {
		f.t.Fatal(err)
	}
	return string(text)
}

// What was known when stays answerable: explain gives the same figures of an early flag after later files, late days, restatements and
// changes of the settings.
func TestExplainStands(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f := newFolder(t, rangesText(ranges))
		files := b.rough()
		known := map[string]string{}
		raised := map[string]record{}
		note := func() {
			for _, r := range f.list("flags", "--all") {
				if _, ok := known[r["ref"]]; ok || r["series"] == "" {
					continue
				}
				known[r["ref"]], raised[r["ref"]] = f.explanation(r["ref"]), r
			}
		}
		f.deliver(b, files[:len(files)/2])
		note()
		f.configure("feeds:\n  - {name: book, files: inbox/*.csv, unit: fraction}\n" + rangesText(changed(ranges)))
		for n, rows := range files[len(files)/2:] {
			f.write(fmt.Sprintf("inbox/g%04d.csv", n), fileText(rows))
		}
		f.must("pass", "--settled")
		if len(known) == 0 {
			t.Error("no flag was raised early")
		}
		latest := map[string]record{}
		for _, r := range f.list("flags", "--all") {
			latest[r["ref"]] = r
		}
		for ref, want := range known {
			if latest[ref]["return"] != raised[ref]["return"] || latest[ref]["kind"] != raised[ref]["kind"] {
				continue // the value was restated and flagged again under the same ref
			}
			if got := f.explanation(ref); got != want {
				t.Errorf("explain %s (%v) gives\n%s\nand gave\n%s", ref, raised[ref], got, want)
				return
			}
		}
	})
}

// changed gives every range another window and another way to treat pending values.
func changed(ranges []oracleRange) (out []oracleRange) {
	for _, r := range ranges {
		r.text = strings.Replace(r.text, fmt.Sprintf("window: %d", r.window), "window: 23", 1)
		r.text = strings.Replace(r.text, "pending: clip", "pending: leave-out", 1)
		out = append(out, r)
	}
	return out
}

// After a change of the settings, the used values of a range are those that a new ledger under the new settings would replay from the
// verdicts as issued: a range that only comes to the others takes every flagged value as its `pending` says.
func TestSettingsChangeReplays(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f, o := newFolder(t, rangesText(ranges)), newOracle(ranges)
		files := b.daily()
		half := len(files) / 2
		f.deliver(b, files[:half])
		for _, rows := range files[:half] {
			o.take(rows)
		}
		added := oracleRange{name: "added", scale: "plain", tail: "normal", side: "both", pending: "clip", window: 30,
			watch: oracleLine{z: 2}, breach: oracleLine{z: 2.5},
			text: "  - {name: added, window: 30, tail: normal, predictive: false, watch: {z: 2}, breach: {z: 2.5}}\n"}
		o.add(added)
		f.configure("feeds:\n  - {name: book, files: inbox/*.csv, unit: fraction}\n" + rangesText(o.ranges))
		for n, rows := range files[half:] {
			f.write(fmt.Sprintf("inbox/g%04d.csv", n), fileText(rows))
			o.take(rows)
		}
		f.must("pass", "--settled")
		o.compareExpected(t, f, b.dates[len(b.dates)-1]+1)
		f.must("ledger", "verify")
	})
}

// add brings in a range: the windows of every series are replayed under it, its verdicts on what was held before are never issued.
func (o *oracle) add(r oracleRange) {
	o.ranges = append(o.ranges, r)
	k := len(o.ranges) - 1
	for _, held := range o.series {
		for i, h := range held {
			v := o.judge(held[:i], k, h.date, h.value)
			h.used = append(h.used, o.usedValue(k, h, &v))
		}
	}
}
