package main

import (
	"fmt"
	"maps"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"strayd/rules"
)

// again has a new oracle judge what another one holds in the end, under other ranges: every value as one first load, with what was decided
// of it known from its own date on.
func (o *oracle) again(ranges []oracleRange) *oracle {
	n := newOracle(ranges)
	for series, held := range o.series {
		all := map[rules.Date]bool{}
		for _, h := range held {
			n.series[series] = append(n.series[series], &oracleObservation{date: h.date, value: h.value, decided: h.decided, takes: h.takes})
			all[h.date] = true
		}
		n.replay(series, all)
	}
	return n
}

// flagged are the kinds that the oracle flags, breach before limit, by series and date, from a date on.
func (o *oracle) flagged(from rules.Date) map[string]string {
	out := map[string]string{}
	for series, held := range o.series {
		for _, h := range held {
			if h.date < from {
				continue
			}
			kind := ""
			if tooLarge(h.value) {
				kind = "limit"
			}
			for k, v := range h.issued {
				if v.finding == "breach" && (!o.ranges[k].limit || kind == "") {
					kind = "limit"
					if !o.ranges[k].limit {
						kind = "breach"
						break
					}
				}
			}
			if kind != "" {
				out[series+" "+h.date.String()] = kind
			}
		}
	}
	return out
}

// unlike is what two oracles do not flag alike.
func unlike(these, other map[string]string) map[string]string {
	out := map[string]string{}
	for at, kind := range other {
		switch old := these[at]; old {
		case kind:
		case "":
			out[at] = "appears " + kind
		default:
			out[at] = "other kind " + kind + " " + old
		}
	}
	for at, kind := range these {
		if other[at] == "" {
			out[at] = "vanishes " + kind
		}
	}
	return out
}

// backFigures are a back-run's figures by part, group, range and name.
type backFigures map[string]record

func (f *folder) backRun(args ...string) backFigures {
	f.t.Helper()
	out := backFigures{}
	for _, r := range f.list(append([]string{"back-run"}, args...)...) {
		out[strings.Join([]string{r["part"], r["group"], r["range"], r["figure"]}, "|")] = r
	}
	return out
}

func (b backFigures) is(t *testing.T, key, column, want string) {
	t.Helper()
	if b[key][column] != want {
		t.Errorf("%s: %s is %q, want %q", key, column, b[key][column], want)
	}
}

// Books that came late, restated and with decisions between, judged again under other ranges: what appears and what vanishes, the counts, the
// coverage and the decisions equal those of an oracle that goes through the same values one by one.
func TestBackRunEqualsTheOracle(t *testing.T) {
	forBooks(t, func(t *testing.T, b *invented, ranges []oracleRange) {
		f, o := newFolder(t, rangesText(ranges)), newOracle(ranges)
		decided := map[string]string{}
		for n, rows := range b.rough() {
			f.arrive(fmt.Sprintf("f%04d.csv", n), fileText(rows))
			if o.take(rows); n%7 == 0 {
				f.concludeSome(b.random, o, decided)
			}
		}
		others := inventRanges(b.random)
		f.write("other.yaml", "ledger: none.db\nfeeds:\n  - {name: book, files: inbox/*.csv, unit: fraction}\n"+rangesText(others))
		ledger := f.bytes("ledger.db")

		days := 10 + b.random.IntN(200)
		from := b.dates[max(0, len(b.dates)-days)]
		got := f.backRun("--with", filepath.Join(f.path, "other.yaml"), "--days", strconv.Itoa(days), "--changed", filepath.Join(f.path, "changed.csv"))
		these, other := o.again(ranges), o.again(others)
		want := unlike(these.flagged(from), other.flagged(from))
		have := map[string]string{}
		for _, r := range records(t, f.bytes("changed.csv")) {
			have[r["series"]+" "+r["date"]] = strings.TrimSpace(r["change"] + " " + r["kind"] + " " + r["kind_before"])
		}
		if !maps.Equal(have, want) {
			t.Errorf("changes:\n%v\nwant\n%v", sorted(have), sorted(want))
		}
		these.countsAgainst(t, got, "these", from)
		other.countsAgainst(t, got, "other", from)
		o.decisionsAgainst(t, got, decided, these.flagged(from), other.flagged(from), from)
		if f.bytes("ledger.db") != ledger {
			t.Error("the ledger changed")
		}
		if len(decided) == 0 || len(want) == 0 {
			t.Errorf("%d decisions, %d changes: the test sees too little", len(decided), len(want))
		}
	})
}

func (f *folder) bytes(name string) string {
	f.t.Helper()
	text, err := os.ReadFile(filepath.Join(f.path, name))
	if err != nil {
		f.t.Fatal(err)
	}
	return string(text)
}

func sorted(m map[string]string) (out []string) {
	for k, v := range m {
		out = append(out, k+": "+v)
	}
	slices.Sort(out)
	return out
}

// countsAgainst holds the counts of a side against the oracle.
func (o *oracle) countsAgainst(t *testing.T, got backFigures, side string, from rules.Date) {
	t.Helper()
	kinds := map[string]int{"breach": 0, "limit": 0}
	type tally struct{ judged, outer, inner int }
	covers := make([]tally, len(o.ranges))
	for _, held := range o.series {
		for _, h := range held {
			if h.date < from {
				continue
			}
			breach, limit := false, tooLarge(h.value)
			for k, v := range h.issued {
				c := &covers[k]
				if o.ranges[k].limit {
					limit = limit || v.finding == "breach"
					continue
				}
				if v.finding != "not judged" {
					c.judged++
					if v.tail < max(0.01, rankLeast(&o.ranges[k])) {
						c.inner++
					}
				}
				if v.finding == "breach" {
					c.outer++
					breach = true
				}
			}
			if breach {
				kinds["breach"]++
			}
			if limit {
				kinds["limit"]++
			}
		}
	}
	got.is(t, "flags|||all", side, strconv.Itoa(kinds["breach"]+kinds["limit"]))
	for kind, n := range kinds {
		if r, there := got["flags|||"+kind]; there || n > 0 {
			if r[side] != strconv.Itoa(n) {
				t.Errorf("%s: %s %s, want %d", side, r[side], kind, n)
			}
		}
	}
	for k, r := range o.ranges {
		if r.limit || covers[k].judged == 0 {
			continue
		}
		key := "coverage||" + r.name + "|"
		got.is(t, key+"breach beyond", side, strconv.Itoa(covers[k].outer))
		got.is(t, key+"breach beyond", side+"_of", strconv.Itoa(covers[k].judged))
		got.is(t, key+"inner beyond", side, strconv.Itoa(covers[k].inner))
	}
}

// rankLeast is the inner line of a range whose window is too short for one in a hundred.
func rankLeast(r *oracleRange) float64 {
	if r.tail == "rank" && r.window+1 < 200 {
		return r.watch.p
	}
	return 0
}

// concludeSome decides some observations at random, has the oracle do the same, and notes the conclusions.
func (f *folder) concludeSome(r *rand.Rand, o *oracle, conclusions map[string]string) {
	f.t.Helper()
	all := f.decidables()
	r.Shuffle(len(all), func(i, j int) { all[i], all[j] = all[j], all[i] })
	for _, d := range all[:min(len(all), r.IntN(7))] {
		date, err := rules.ParseDate(d.date)
		if err != nil {
			f.t.Fatal(err)
		}
		decided := d.draw(r, o.value(d.series, d.date))
		f.decide(decided, fmt.Sprint("note ", len(conclusions), r.Uint32()))
		o.decide(d.series, date, decided.takes)
		conclusions[d.series+" "+d.date] = decided.words[0]
	}
}

// decisionsAgainst holds the decisions counted for and against.
func (o *oracle) decisionsAgainst(t *testing.T, got backFigures, conclusions, these, other map[string]string, from rules.Date) {
	t.Helper()
	decided, by := map[string]int{}, map[string]map[string]int{"these": {}, "other": {}}
	pro, con := 0, 0
	for series, held := range o.series {
		for _, h := range held {
			if h.date < from || !h.decided {
				continue
			}
			at := series + " " + h.date.String()
			word, a, b := conclusions[at], these[at] != "", other[at] != ""
			decided[word]++
			if a {
				by["these"][word]++
			}
			if b {
				by["other"][word]++
			}
			if a != b && (word == "genuine") == a {
				pro++
			} else if a != b {
				con++
			}
		}
	}
	for _, word := range []string{"genuine", "error", "corrected"} {
		for side, n := range by {
			got.is(t, "decisions|||"+word, side, strconv.Itoa(n[word]))
			got.is(t, "decisions|||"+word, side+"_of", strconv.Itoa(decided[word]))
		}
	}
	got.is(t, "decisions|||for", "other", strconv.Itoa(pro))
	got.is(t, "decisions|||against", "other", strconv.Itoa(con))
}
