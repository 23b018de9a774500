package main

import (
	"fmt"
	"math"
	"os"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"strayd/stats"
)

// The README's table of |z| against once in N days: the distributions' own figures, and the counts that the program gives under its
// defaults on the four open index series.
func TestReadmeTailTable(t *testing.T) {
	rows := regexp.MustCompile(`(?m)^\| (\d) \| (.*) days \| (.*) days \| ([\d,]+) days \((\d+)( times)?\) \|$`).FindAllStringSubmatch(readme(t), -1)
	if len(rows) != 5 {
		t.Fatalf("README's table has %d rows, want 5", len(rows))
	}
	t5, err := stats.ScaledT(5)
	if err != nil {
		t.Fatal(err)
	}
	judged, sizes := openSizes(t)
	for _, r := range rows {
		z := days(t, r[1])
		for i, tail := range []stats.Tail{t5, stats.Normal()} {
			p, _ := tail.TwoSided(z)
			// Printed to whole days, and to three digits from a million on.
			if got := days(t, r[2+i]); math.Abs(got*p-1) > max(0.5*p, 0.005*float64(i)) {
				t.Errorf("|z| beyond %v: README says once in %v days, the tail once in %v", z, got, 1/p)
			}
		}
		beyond := 0
		for _, size := range sizes {
			if size > z {
				beyond++
			}
		}
		if days(t, r[5]) != float64(beyond) || days(t, r[4]) != math.Round(float64(judged)/float64(beyond)) {
			t.Errorf("|z| beyond %v: README says %s times, once in %s days; the program has %d in %d", z, r[5], r[4], beyond, judged)
		}
	}
}

// openSizes runs the four open index series under the default range and gives every |z| of a full window.
func openSizes(t *testing.T) (judged int, sizes []float64) {
	f := newFolder(t, "doubtful: 0%\nranges:\n  - {name: own}\n")
	for _, series := range openSeries[:4] {
		rows := reference(t, "data/"+series+".csv")
		dates := openDates(t, rows)
		var text strings.Builder
		text.WriteString("date,series,return\n")
		for i, r := range rows {
			fmt.Fprintf(&text, "%s,%s,%s\n", dates[i], series, r["ret"])
		}
		f.write("inbox/"+series+".csv", text.String())
	}
	f.must("pass", "--settled")
	for _, series := range openSeries[:4] {
		for _, r := range f.list("history", series) {
			if r["n"] == "60" {
				sizes = append(sizes, math.Abs(r.number(t, "z")))
			}
		}
	}
	return len(sizes), sizes
}

// days reads a figure of the table: 15,787 or 1.74 million.
func days(t *testing.T, s string) float64 {
	t.Helper()
	digits, million := strings.CutSuffix(strings.ReplaceAll(s, ",", ""), " million")
	v, err := strconv.ParseFloat(digits, 64)
	if err != nil {
		t.Fatal(err)
	}
	if million {
		v *= 1e6
	}
	return v
}

// What other programs read is in the README as the program has it.
func TestReadmeNamesColumnsAndCommands(t *testing.T) {
	text := readme(t)
	for _, columns := range []string{flagColumns, rangeColumns, drillColumns, plantColumns} {
		if !strings.Contains(text, "`"+columns+"`") {
			t.Errorf("README does not have the columns %s", columns)
		}
	}
	for _, column := range strings.Split(historyColumns, ",") {
		if !strings.Contains(text, "`"+column+"`") {
			t.Errorf("README does not explain the column %s", column)
		}
	}
	for _, code := range []int{exitDone, exitFailed, exitUsage, exitHeld, exitDamaged, exitConfig} {
		if !strings.Contains(text, fmt.Sprintf("\n| %d | ", code)) {
			t.Errorf("README does not explain exit code %d", code)
		}
	}
	a := &app{}
	for _, c := range a.root().Commands() {
		if !strings.Contains(text, "\n| `"+c.Name()) {
			t.Errorf("README does not have the command %s", c.Name())
		}
	}
}

// NOTICE names every module of go.mod.
func TestNoticeNamesEveryModule(t *testing.T) {
	mod, err := os.ReadFile("../../go.mod")
	if err != nil {
		t.Fatal(err)
	}
	notice, err := os.ReadFile("../../NOTICE")
	if err != nil {
		t.Fatal(err)
	}
	modules := regexp.MustCompile(`(?m)^\t(\S+?)(/v\d+)? v`).FindAllStringSubmatch(string(mod), -1)
	if len(modules) < 10 {
		t.Fatalf("go.mod has %d modules", len(modules))
	}
	for _, m := range modules {
		if !strings.Contains(string(notice), m[1]) {
			t.Errorf("NOTICE does not name %s", m[1])
		}
	}
}
