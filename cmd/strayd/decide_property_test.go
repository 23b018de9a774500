package main

import (
	"fmt"
	"maps"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// decidable is one observation with the refs of the flags that are about its newest version.
type decidable struct {
	series, date string
	refs         []string
}

// decidables lists the observations that somebody could decide, in the order of their refs.
func (f *folder) decidables() (out []decidable) {
	f.t.Helper()
	at := map[string]int{}
	for _, g := range f.list("flags", "--all") {
		if g["series"] == "" || strings.Contains(g["note"], "for which it would not be raised") {
			continue
		}
		key := g["series"] + " " + g["date"]
		n, ok := at[key]
		if !ok {
			n = len(out)
			at[key] = n
			out = append(out, decidable{series: g["series"], date: g["date"]})
		}
		out[n].refs = append(out[n].refs, g["ref"])
	}
	return out
}

// decision is one that was drawn for an observation.
type decision struct {
	decidable
	words []string
	takes rules.Units // what windows take by it
}

// draw chooses what is decided of an observation whose value is given.
func (d decidable) draw(r *rand.Rand, value rules.Units) decision {
	switch r.IntN(3) {
	case 0:
		return decision{d, []string{"genuine", "--reason", "unexplained"}, value}
	case 1:
		return decision{d, []string{"error", "--reason", "data error"}, rules.Missing}
	}
	corrected := value/rules.Units(2+r.IntN(200)) + rules.Units(r.Int64N(2000)-1000)
	return decision{d, []string{"corrected", corrected.String(), "--reason", "data error"}, corrected}
}

func (f *folder) decide(d decision, note string) string {
	f.t.Helper()
	return f.must(slices.Concat([]string{"decide"}, d.refs, d.words, []string{"--note", note})...)
}

func (o *oracle) value(series, date string) rules.Units {
	for _, h := range o.series[series] {
		if h.date.String() == date {
			return h.value
		}
	}
	return rules.Missing
}

// lastEntry is the newest entry of the record.
func (f *folder) lastEntry() (e *rules.Entry) {
	f.t.Helper()
	l, err := ledger.Open(filepath.Join(f.path, "ledger.db"), ledger.Options{Mode: ledger.ReadOnly})
	if err != nil {
		f.t.Fatal(err)
	}
	defer l.Close()
	v, err := l.Read()
	if err != nil {
		f.t.Fatal(err)
	}
	defer v.Close()
	if err := v.Record(func(r ledger.Entry) bool {
		if r.Kind == watcher.DecisionEntry {
			e, err = rules.ParseEntry(r.Body)
		}
		return err == nil
	}); err != nil {
		f.t.Fatal(err)
	}
	return e
}

// Files that come late and restated, with decisions between them: every figure of every later verdict equals that of an oracle that
// carries the same decisions, and each answer lists what the oracle says would now differ from what was issued.
func TestDecisionsEqualTheOracle(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f, o := newFolder(t, rangesText(ranges)), newOracle(ranges)
		files := b.rough()
		var waiting [][]bookRow
		made := 0
		for n, rows := range files {
			f.write(fmt.Sprintf("inbox/f%04d.csv", n), fileText(rows))
			waiting = append(waiting, rows)
			if n < len(files)-1 && b.random.IntN(12) > 0 {
				continue
			}
			f.must("pass", "--settled")
			for _, rows := range waiting {
				o.take(rows)
			}
			waiting = nil
			made += f.decideSome(b.random, o, 6)
		}
		if made < 10 {
			t.Errorf("only %d decisions", made)
		}
		o.compare(t, f)
		f.must("ledger", "verify")
	})
}

// decideSome decides some observations at random, and has the oracle do the same.
func (f *folder) decideSome(r *rand.Rand, o *oracle, most int) (made int) {
	f.t.Helper()
	all := f.decidables()
	r.Shuffle(len(all), func(i, j int) { all[i], all[j] = all[j], all[i] })
	for _, d := range all[:min(len(all), r.IntN(most+1))] {
		date, err := rules.ParseDate(d.date)
		if err != nil {
			f.t.Fatal(err)
		}
		decided := d.draw(r, o.value(d.series, d.date))
		before := o.breaches(d.series, date)
		f.decide(decided, fmt.Sprint("note ", made))
		o.decide(d.series, date, decided.takes)
		f.differs(o, d, date, before)
		made++
	}
	return made
}

// differs holds what the answer says would now differ against the oracle.
func (f *folder) differs(o *oracle, d decidable, date rules.Date, before map[string]bool) {
	f.t.Helper()
	want := map[string]bool{}
	issued := o.issued(d.series)
	for key, now := range o.breaches(d.series, date) {
		if now != before[key] && now != issued[key] {
			want[key] = now
		}
	}
	got := map[string]bool{}
	for _, x := range f.lastEntry().Differ {
		if x.Series != d.series {
			f.t.Errorf("a decision of %s changes %s", d.series, x.Series)
		}
		got[x.Date.String()+" "+x.Range] = x.Now == rules.Breach
	}
	if !maps.Equal(got, want) {
		f.t.Errorf("after the decision of %s on %s: differ %v, want %v", d.series, d.date, got, want)
	}
}

// twoGroups put most series of an invented book into groups, whose members are weighed together and lend each other deviations.
const twoGroups = "groups:\n  - {name: one, series: [series-0*]}\n  - {name: two, series: [series-1*], reference: series-00}\n"

// Decided in any order, the windows take the same of everything, bit for bit.
func TestDecisionsInAnyOrder(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		groups := ""
		if b.random.IntN(2) == 0 {
			groups = twoGroups
		}
		f, o := newFolder(t, rangesText(ranges)+groups), newOracle(ranges)
		files := b.chunks()
		f.deliver(b, files)
		for _, rows := range files {
			o.take(rows)
		}
		var decisions []decision
		for _, d := range f.decidables() {
			decisions = append(decisions, d.draw(b.random, o.value(d.series, d.date)))
		}
		b.random.Shuffle(len(decisions), func(i, j int) { decisions[i], decisions[j] = decisions[j], decisions[i] })
		decisions = decisions[:min(len(decisions), 20)]
		untouched, err := os.ReadFile(filepath.Join(f.path, "ledger.db"))
		if err != nil {
			t.Fatal(err)
		}
		first := ""
		for range 3 {
			f.write("ledger.db", string(untouched))
			for n, d := range decisions {
				f.decide(d, fmt.Sprint("note ", n))
			}
			history := ""
			for _, series := range o.names() {
				history += f.must("history", series, "--format", "csv")
			}
			history += f.must("ranges", "--now", "2026-01-01", "--format", "csv")
			f.must("ledger", "verify")
			if first == "" {
				first = history
			} else if history != first {
				t.Fatal("the histories of two orders differ")
			}
			b.random.Shuffle(len(decisions), func(i, j int) { decisions[i], decisions[j] = decisions[j], decisions[i] })
		}
	})
}
