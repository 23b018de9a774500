package main

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// referenced is a book whose funds are held against an index, with a range of returns and one of residuals.
const referenced = `feeds:
  - {name: book, files: inbox/*.csv, unit: fraction, schedule: "0 3 1 1 *"}
groups:
  - {name: funds, series: ["fund-*"], reference: index}
ranges:
  - {name: own, window: 60, watch: {z: 3}, breach: {z: 4}}
  - {name: apart, of: residual, for: [funds], window: 60, watch: {z: 4}, breach: {z: 6}}
doubtful: 0%
`

// A market move is taken of a fund that fell with its index, and not of one that fell alone, whose weekly log lists why it was taken all the
// same. The index itself has no reference, so that nothing bears a market move of it out.
func TestMarketMoveNeedsTheResidual(t *testing.T) {
	f := &folder{t, t.TempDir()}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.configure(referenced)
	f.must("init")
	const history = 160
	random := rand.New(rand.NewPCG(5, 5))
	text, day := strings.Builder{}, time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC)
	text.WriteString("date,series,return\n")
	write := func(index float64, funds ...float64) {
		for day = day.AddDate(0, 0, 1); day.Weekday() == time.Saturday || day.Weekday() == time.Sunday; day = day.AddDate(0, 0, 1) {
		}
		at := day.Format(time.DateOnly)
		fmt.Fprintf(&text, "%s,index,%.6f\n", at, index)
		for n, v := range funds {
			fmt.Fprintf(&text, "%s,fund-%d,%.6f\n", at, n, v)
		}
	}
	noise := func() float64 { return 0.001 * random.NormFloat64() }
	for range history {
		index := 0.005 * random.NormFloat64()
		write(index, index+noise(), index+noise(), index+noise())
	}
	f.arrive("a.csv", text.String())
	text.Reset()
	text.WriteString("date,series,return\n")
	write(-0.05, -0.05+noise(), -0.05+noise(), 0.03)
	f.arrive("b.csv", text.String())

	refs := map[string]string{}
	for _, g := range f.list("flags", "--kind", "breach", "--date", day.Format(time.DateOnly)) {
		refs[g["series"]] = g["ref"]
	}
	if len(refs) != 4 {
		t.Fatalf("breaches: %v", refs)
	}
	decide := func(series string, more ...string) (code int, errs string) {
		args := append([]string{"decide", refs[series], "genuine", "--reason", "market move", "--note", "all fell"}, more...)
		code, _, errs = f.try(args...)
		return code, errs
	}
	for _, c := range []struct{ series, refusal string }{
		{"fund-0", ""},
		{"fund-1", ""},
		{"fund-2", `is no market move: what its reference leaves unexplained is out of range "apart"`},
		{"index", "is no market move: no residual range judged it"},
	} {
		code, errs := decide(c.series)
		if ok := c.refusal == ""; ok != (code == exitDone) || !strings.Contains(errs, c.refusal) {
			t.Errorf("%s: exit %d\n%s", c.series, code, errs)
		}
	}
	if code, _, errs := f.try("decide", refs["fund-0"], refs["fund-2"], "genuine", "--reason", "market move", "--note", "both"); code != exitFailed ||
		!strings.Contains(errs, "flag "+refs["fund-2"]+" is no market move") {
		t.Errorf("several at once: exit %d\n%s", code, errs)
	}
	if code, errs := decide("fund-2", "--override", "its hedge was closed that day"); code != exitDone {
		t.Errorf("with an override: exit %d\n%s", code, errs)
	}
	year, week := time.Now().UTC().ISOWeek()
	if log := f.must("weekly", fmt.Sprintf("%d-W%02d", year, week), "--format", "text"); !strings.Contains(log, "its hedge was closed that day") {
		t.Errorf("the weekly log does not list it\n%s", log)
	}
	f.must("ledger", "verify")
}
