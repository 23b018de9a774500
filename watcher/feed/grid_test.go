package feed

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// fakeGrid gives the rows of a text as cells; row 0 is the header where it is no row of its own.
type fakeGrid struct {
	rows  [][]watcher.GridCell
	first int
	at    int
	fault *watcher.GridFault
	since bool
}

func (g *fakeGrid) Next() ([]watcher.GridCell, int, error) {
	if g.at == len(g.rows) {
		if g.fault != nil {
			return nil, 0, g.fault
		}
		return nil, 0, io.EOF
	}
	g.at++
	return g.rows[g.at-1], g.first + g.at - 1, nil
}

func (g *fakeGrid) Place(row, column int) string { return fmt.Sprintf("R%dC%d", row, column+1) }
func (g *fakeGrid) From1904() bool               { return g.since }
func (g *fakeGrid) Notes() []string              { return nil }
func (g *fakeGrid) Close() error                 { return nil }

// readGrid reads a grid as the feed declares it.
func readGrid(t *testing.T, f rules.Feed, g *fakeGrid) (*watcher.Sheet, error) {
	t.Helper()
	opened := func(io.ReaderAt, int64, string, watcher.GridBounds) (watcher.Grid, error) { return g, nil }
	return read(t, f, "a.cells", "x", Options{Workers: 2, chunk: 7, Grids: map[string]watcher.OpenGrid{".cells": opened}})
}

// cellsOf parts each line at its commas.
func cellsOf(t *testing.T, text string) (rows [][]watcher.GridCell) {
	t.Helper()
	r := csv.NewReader(strings.NewReader(text))
	r.FieldsPerRecord = -1
	all, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, record := range all {
		var row []watcher.GridCell
		for _, c := range record {
			row = append(row, watcher.GridCell{Text: c})
		}
		rows = append(rows, row)
	}
	return rows
}

// The same cells as text and as a grid give the same values, or are refused for the same reason at the same line.
func TestGridIsReadAsText(t *testing.T) {
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	rng := rand.New(rand.NewPCG(seed, 4))
	pick := func(from ...string) string { return from[rng.IntN(len(from))] }
	for range 400 {
		var b strings.Builder
		b.WriteString("date,series,return\n")
		for i := range rng.IntN(30) {
			value := pick("0.1", "-2", "1e-3", "0.123456789", "NA", "", "7")
			if rng.IntN(60) == 0 {
				value = pick("abc", "NaN", "#N/A", "1.2.3", "9999999")
			}
			fmt.Fprintf(&b, "2024-01-%02d,S%d,%s\n", 1+i, rng.IntN(5), value)
		}
		if rng.IntN(3) == 0 {
			fmt.Fprintf(&b, "#rows %d\n", rng.IntN(30))
		}
		f := longFeed()
		f.SkipShare = float64(rng.IntN(2)) * 0.3
		s, err := read(t, f, "a.csv", b.String(), Options{})
		g, gErr := readGrid(t, f, &fakeGrid{rows: cellsOf(t, b.String()), first: 1})
		if (err == nil) != (gErr == nil) || err == nil && spell(s) != spell(g) {
			t.Fatalf("%s\nas text: %v\nas grid: %v", b.String(), err, gErr)
		}
		var bad, gBad *watcher.BadFile
		if errors.As(err, &bad) && errors.As(gErr, &gBad) && (bad.Reason != gBad.Reason || bad.Line != gBad.Line || bad.Cell != gBad.Cell) {
			t.Fatalf("%s\nas text: %v\nas grid: %v", b.String(), err, gErr)
		}
	}
}

// What a grid adds: days, numbers under any decimal mark, per cent, its own words for a place, and its own faults.
func TestGridCells(t *testing.T) {
	day := func(s string) watcher.GridCell {
		d, err := rules.ParseDate(s)
		if err != nil {
			t.Fatal(err)
		}
		return watcher.GridCell{Kind: watcher.DateCell, Date: d}
	}
	text := func(s string) watcher.GridCell { return watcher.GridCell{Text: s} }
	num := func(s string) watcher.GridCell { return watcher.GridCell{Kind: watcher.NumberCell, Text: s} }
	pct := func(s string) watcher.GridCell { return watcher.GridCell{Kind: watcher.PercentCell, Text: s} }
	header := []watcher.GridCell{text("date"), text("series"), text("return")}
	check := func(what string, with with, g *fakeGrid, want string) {
		t.Helper()
		f := longFeed()
		with(&f)
		s, err := readGrid(t, f, g)
		got := fmt.Sprint(err)
		if err == nil {
			got = spell(s)
		}
		if got != want {
			t.Errorf("%s: got\n%s\nwant\n%s", what, got, want)
		}
	}
	book := func(first int, rows ...[]watcher.GridCell) *fakeGrid {
		return &fakeGrid{rows: append([][]watcher.GridCell{header}, rows...), first: first}
	}
	row := func(cells ...watcher.GridCell) []watcher.GridCell { return cells }
	const good = "2024-01-02 A 0.01 2\n"
	check("a day is a day", plain, book(1, row(day("2024-01-02"), text("A"), num("0.01"))), good)
	check("whatever the style", dates("DD-MMM-YY"), book(1, row(day("2024-01-02"), text("A"), num("0.01"))), good)
	check("also as a serial day", dates("excel"), book(1, row(day("2024-01-02"), text("A"), num("0.01"))), good)
	check("a serial number", dates("excel"), book(1, row(num("45293"), text("A"), num("0.01"))), good) // 45292 is 2024-01-01
	since := book(1, row(num("43831"), text("A"), num("0.01")), row(day("2024-01-03"), text("A"), num("0.02")))
	since.since = true // 45293 - 1462
	check("from 1904", dates("excel"), since, good+"2024-01-03 A 0.02 3\n")
	check("a decimal comma is for texts", semicolon, book(1, row(text("2024-01-02"), text("A"), num("0.01")), row(text("2024-01-03"), text("A"), text("0,02"))),
		good+"2024-01-03 A 0.02 3\n")
	check("per cent is a fraction", plain, book(1, row(day("2024-01-02"), text("A"), pct("0.01"))), good)
	check("and no per cent", func(f *rules.Feed) { f.Unit = rules.Percent }, book(1, row(day("2024-01-02"), text("A"), pct("0.01"))),
		`a.cells:R2C3: the cell is shown as per cent: a number so shown holds the fraction, declare unit: fraction; a text, deliver the bare number: "0.01%"`)
	check("a header that is no row", plain, book(0, row(day("2024-01-02"), text("A"), num("0.01"))), "2024-01-02 A 0.01 1\n")
	check("its faults", plain, book(0, row(day("2024-01-02"), text("A"), num("x"))), `a.cells:R1C3: the value is not a number: "x"`)
	check("a title above", plain, book(3, row(day("2024-01-02"), text("A"), num("x"))), `a.cells:R4C3: the value is not a number: "x"`)
	check("marks within a cell", plain, book(1, row(day("2024-01-02"), text("A \"b\",\nc"), num("1"))),
		`a.cells:R2C2: the name of the series holds the invisible character U+000A: "A \"b\",\nc"`)
	check("a cell too many", plain, book(1, row(day("2024-01-02"), text("A"), num("1"), num("2"))), "a.cells:R2C0: the line has 4 cells, the header has 3")
	check("control totals", plain, book(1, row(day("2024-01-02"), text("A"), num("0.01")), row(text("#rows 1"))), good)
	check("that do not hold", plain, book(1, row(day("2024-01-02"), text("A"), num("0.01")), row(text("#rows 2"))),
		`a.cells:R3C0: the control total says 2 rows, the file has 1; ask the provider to send it whole: "2"`)
	broken := book(1, row(day("2024-01-02"), text("A"), num("0.01")))
	broken.fault = &watcher.GridFault{Row: 7, Column: 1, Cell: "=A1", Reason: "the cell is broken"}
	check("its own fault", plain, broken, `a.cells:R7C2: the cell is broken: "=A1"`)
	check("nothing", plain, &fakeGrid{}, "a.cells: the file is empty")
}
