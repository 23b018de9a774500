package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/rules/drill"
)

// bookFolder is a folder for an invented book, with an empty ledger.
func bookFolder(t *testing.T, b *drill.Book) *folder {
	t.Helper()
	f := &folder{t, t.TempDir()}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.write("strayd.yaml", drill.InventedConfig)
	f.write("series.csv", b.RegisterText())
	f.write("events.csv", b.EventsText())
	f.must("init")
	return f
}

// arriveAt delivers the dates from..to of a book, one file a feed, and runs a pass.
func (f *folder) arriveAt(b *drill.Book, from, to int, now string) {
	f.t.Helper()
	for _, feed := range []string{drill.BenchFeed, drill.FundsFeed} {
		text, _ := b.Text(feed, from, to)
		f.write(fmt.Sprintf("inbox/%s-%s.csv", feed, b.Dates[from]), text)
	}
	f.must("pass", "--settled", "--now", now)
}

// What the command says is what a person finds who plants the same errors in files, runs a pass a day from the command line, lists the
// flags and counts them.
func TestDrillSaysWhatPassesByHandFind(t *testing.T) {
	const days, from, seed = 120, 90, 5
	b := drill.Invent(drill.Invention{Seed: seed, Days: days, FX: true})
	own := bookFolder(t, b)
	own.arriveAt(b, 0, days, b.Dates[days-1].String()+"T20:00:00Z")
	before := own.must("flags", "--all", "--format", "csv")
	kinds := drill.Rounds(drill.Kinds)[0]
	got := own.list("drill", "--seed", strconv.Itoa(seed), "--days", strconv.Itoa(days-from), "--kinds", strings.ReplaceAll(joinWords(kinds), " ", ""))
	if after := own.must("flags", "--all", "--format", "csv"); after != before {
		t.Error("the user's own flags changed")
	}

	plan := drill.Draw(b, drill.NewFits(b), drill.Options{Seed: seed, Kinds: kinds, From: from})
	planted := plan.Apply(b)
	hand := bookFolder(t, b)
	hand.arriveAt(planted, 0, from, b.Dates[from-1].String()+"T18:00:00Z")
	hand.write("events.csv", planted.EventsText())
	for at := from; at < days; at++ {
		hand.arriveAt(planted, at, at+1, b.Dates[at].String()+"T17:30:00Z")
	}
	flags := hand.drillFlags(b.Dates[from])
	want := map[string]drill.Row{}
	for _, r := range drill.ByKind(drill.Outcomes(b, plan, flags)) {
		want[r.Name] = r
	}
	if len(want) < 15 {
		t.Fatalf("%d kinds planted: %v", len(want), want)
	}
	for _, r := range got {
		if w, ok := want[r["name"]]; ok && r["by"] == "kind" {
			if have := row(r); have != w {
				t.Errorf("%s: %+v, by hand %+v", w.Name, have, w)
			}
			delete(want, r["name"])
		}
		if r["by"] == "untouched" && r["name"] == "own" {
			q := drill.Untouched(b, plan, flags, []drill.Promise{{Name: "own", Kinds: []rules.Kind{rules.KindBreach}, Range: "own", Share: 0.0027}})[0]
			if r["flags"] != strconv.Itoa(q.Flags) || r["values"] != strconv.Itoa(q.Values) {
				t.Errorf("untouched: %v, by hand %+v", r, q)
			}
		}
	}
	if len(want) > 0 {
		t.Errorf("not in the table: %v", want)
	}
}

// row reads a row of the listing; what the listing does not have is left out.
func row(r record) drill.Row {
	n := func(column string) int {
		v, err := strconv.Atoi(r[column])
		if err != nil {
			return -1
		}
		return v
	}
	return drill.Row{Name: r["name"], Planted: n("planted"), SameDay: n("same_day"), FiveDays: n("five_days"), Right: n("right"), Wrong: n("wrong"),
		Not: n("not_named"), Single: n("single"), Flags: n("flags"), Followed: n("followed")}
}

// drillFlags lists the flags of a folder from a date on as the scoring takes them.
func (f *folder) drillFlags(from rules.Date) (out []drill.Flag) {
	f.t.Helper()
	for _, r := range f.list("flags", "--all", "--from", from.String()) {
		date, err := rules.ParseDate(r["date"])
		if err != nil {
			f.t.Fatal(err)
		}
		raised, err := rules.ParseDate(r["raised_at"][:10])
		if err != nil {
			f.t.Fatal(err)
		}
		out = append(out, drill.Flag{Date: date, Raised: raised, Series: r["series"], Group: r["group"], Feed: r["feed"], Kind: rules.Kind(r["kind"]),
			Range: r["range"], LooksLike: rules.Cause(r["looks_like"])})
	}
	return out
}
