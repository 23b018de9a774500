package main

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"testing"

	"strayd/rules"
)

// A change of the settings in the week is told with what back-run says of the same two settings; the errors decided in it with their size
// against the materiality that is set, and how long they stood. A new week does not change what was told.
func TestWeeklyRunsChangesBack(t *testing.T) {
	b := invent(7)
	first := "ranges:\n  - {name: own, window: 40}\n"
	second := "ranges:\n  - {name: own, window: 40, breach: {tail: 0.9%}}\n  - {name: wide, window: 20, breach: {tail: 0.5%}}\n"
	group := "groups:\n  - {name: all, series: [series-*], reference: none, materiality: 0.5%}\n"
	feed := "feeds:\n  - {name: book, files: inbox/*.csv, unit: fraction}\n"
	f := newFolder(t, group+first)
	f.configure(feed + group + first)
	files := b.daily()
	last := b.dates[len(b.dates)-1]
	monday := rules.MondayOf(last)
	var past, week []bookRow
	for _, day := range files {
		if day[0].date < monday {
			past = append(past, day...)
		} else {
			week = append(week, day...)
		}
	}
	f.write("inbox/a.csv", fileText(past))
	f.must("pass", "--settled", "--now", (monday-1).String()+"T12:00:00Z")
	f.configure(feed + group + second)
	f.write("inbox/b.csv", fileText(week))
	f.must("pass", "--settled", "--now", last.String()+"T18:00:00Z")
	ref, received := "", 0.0
	for _, g := range f.list("flags", "--all") {
		if g["kind"] == "breach" {
			ref, received = g["ref"], g.number(t, "return")
		}
	}
	f.must("decide", ref, "corrected", "0.001", "--reason", "data-error", "--note", "a slip", "--now", last.String()+"T21:00:00Z")

	now := (monday + 7).String() + "T07:00:00Z"
	log := f.list("weekly", rules.WeekName(monday), "--now", now)
	f.write("old.yaml", "ledger: none.db\n"+feed+group+first)
	run := f.backRun("--with", filepath.Join(f.path, "old.yaml"), "--now", now)
	for _, x := range []struct{ subject, key string }{{"", "flags|||all"}, {"own", "coverage||own|breach beyond"},
		{"wide", "coverage||wide|breach beyond"}} {
		subject := "flags of every kind"
		if x.subject != "" {
			subject = "beyond " + x.subject
		}
		before := figureOf(t, log, "settings", "back-run", subject, "before, of values")
		after := figureOf(t, log, "settings", "back-run", subject, "after, of values")
		if before["value"] != run[x.key]["other"] || after["value"] != run[x.key]["these"] || after["value"] == "" {
			t.Errorf("%s: the log has %s and %s, back-run %s and %s", subject, before["value"], after["value"], run[x.key]["other"], run[x.key]["these"])
		}
		if x.subject != "" && after["of"] != run[x.key]["these_of"] {
			t.Errorf("%s: of %s in the log, of %s in back-run", subject, after["of"], run[x.key]["these_of"])
		}
	}
	own := func(when string) string { return figureOf(t, log, "settings", "back-run", "beyond own", when)["value"] }
	if own("before, of values") == own("after, of values") {
		t.Error("the wider line flags as much: the test sees too little")
	}

	size := figureOf(t, log, "found", "error", ref, "size")
	if want := math.Abs(received - 0.001); math.Abs(size.number(t, "value")-want) > 1e-12 {
		t.Errorf("size %s, want %v", size["value"], want)
	}
	if got := figureOf(t, log, "found", "error", ref, "materiality"); got["value"] != "0.005" {
		t.Errorf("materiality %s, want 0.005", got["value"])
	}
	// It came by the pass of the week's last date at 18:00, or by the first load; it was flagged as it came.
	if got := figureOf(t, log, "found", "error", ref, "hours to the flag"); got["value"] != "0" {
		t.Errorf("%s hours from arrival to the flag, want 0", got["value"])
	}
	if got := figureOf(t, log, "found", "", "", "Median hours from arrival to the decision"); got["value"] != "3" {
		t.Errorf("%s hours from arrival to the decision, want 3", got["value"])
	}

	f.write("inbox/c.csv", fmt.Sprintf("date,series,return\n%s,series-new,0.01\n%s,series-00,0.02\n", monday+8, monday+8))
	f.must("pass", "--settled", "--now", (monday+8).String()+"T18:00:00Z")
	figures := func(rows []record) (out []string) {
		for _, r := range rows {
			if r["section"] == "settings" || r["section"] == "found" {
				out = append(out, fmt.Sprint(r["table"], r["subject"], r["figure"], r["shown"]))
			}
		}
		return out
	}
	settled := figures(f.list("weekly", rules.WeekName(monday), "--now", (monday+8).String()+"T00:00:00Z"))
	if got := figures(f.list("weekly", rules.WeekName(monday), "--now", (monday+50).String()+"T00:00:00Z")); !slices.Equal(got, settled) {
		t.Errorf("the log reads otherwise later: %v\nbefore %v", got, settled)
	}
}
