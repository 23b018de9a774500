package main

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"github.com/parquet-go/parquet-go"
	"github.com/xuri/excelize/v2"
)

// gridBook is a small book: 70 days of four series, with one value that is a hundred times too large on the last day.
func gridBook(t *testing.T) (days []time.Time, names []string, values [][]string) {
	t.Helper()
	const seed = 11
	rng := rand.New(rand.NewPCG(seed, 2))
	names = []string{"alder", "birch", "cedar", "dale"}
	for day := time.Date(2025, 12, 1, 0, 0, 0, 0, time.UTC); len(days) < 70; day = day.AddDate(0, 0, 1) {
		if day.Weekday() == time.Saturday || day.Weekday() == time.Sunday {
			continue
		}
		days = append(days, day)
		var row []string
		for i := range names {
			v := strconv.FormatFloat(float64(int(1e6*0.004*rng.NormFloat64()))/1e6, 'f', 6, 64)
			if len(days) == 70 && i == 1 {
				v = "0.31"
			}
			row = append(row, v)
		}
		values = append(values, row)
	}
	return days, names, values
}

func bookCSV(days []time.Time, names []string, values [][]string) []byte {
	b := new(bytes.Buffer)
	fmt.Fprintln(b, "date,series,return")
	for d, day := range days {
		for i, name := range names {
			fmt.Fprintf(b, "%s,%s,%s\n", day.Format(time.DateOnly), name, values[d][i])
		}
	}
	return b.Bytes()
}

// bookXLSX writes the book as a workbook: days as formatted serial numbers of the system, values as numbers.
func bookXLSX(t *testing.T, days []time.Time, names []string, values [][]string, from1904 bool) []byte {
	t.Helper()
	f := excelize.NewFile()
	defer f.Close() //nolint:errcheck // a test's
	must := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	must(f.SetWorkbookProps(&excelize.WorkbookPropsOptions{Date1904: &from1904}))
	must(f.SetSheetRow("Sheet1", "A1", &[]string{"date", "series", "return"}))
	style, err := f.NewStyle(&excelize.Style{NumFmt: 14})
	must(err)
	row := 2
	for d, day := range days {
		for i, name := range names {
			v, err := strconv.ParseFloat(values[d][i], 64)
			must(err)
			serial := int(day.Unix()/86400) + 25569
			if from1904 {
				serial -= 1462
			}
			must(f.SetSheetRow("Sheet1", fmt.Sprintf("A%d", row), &[]any{serial, name, v}))
			must(f.SetCellStyle("Sheet1", fmt.Sprintf("A%d", row), fmt.Sprintf("A%d", row), style))
			row++
		}
	}
	var b bytes.Buffer
	must(f.Write(&b))
	return b.Bytes()
}

type pqRow struct {
	Date   int32   `parquet:"date,date"`
	Series string  `parquet:"series"`
	Return float64 `parquet:"return"`
}

func bookParquet(t *testing.T, days []time.Time, names []string, values [][]string, options ...parquet.WriterOption) []byte {
	t.Helper()
	var rows []pqRow
	for d, day := range days {
		for i, name := range names {
			v, err := strconv.ParseFloat(values[d][i], 64)
			if err != nil {
				t.Fatal(err)
			}
			rows = append(rows, pqRow{int32(day.Unix() / 86400), name, v})
		}
	}
	var b bytes.Buffer
	w := parquet.NewGenericWriter[pqRow](&b, options...)
	if _, err := w.Write(rows); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// gridDesk is a folder with a ledger, to lay files into.
type gridDesk struct {
	t   *testing.T
	dir string
}

func newGridDesk(t *testing.T, feed string) *gridDesk {
	t.Helper()
	d := &gridDesk{t, t.TempDir()}
	d.lay("strayd.yaml", []byte("ledger: ledger.db\nfeeds:\n  - {name: book, files: inbox/*"+feed+"}\nranges:\n  - {name: own}\n"))
	d.lay("inbox/.keep", nil)
	d.do(exitDone, "init")
	return d
}

func (d *gridDesk) lay(name string, content []byte) {
	d.t.Helper()
	path := filepath.Join(d.dir, name)
	if err := os.MkdirAll(filepath.Dir(path), 0o700); err != nil {
		d.t.Fatal(err)
	}
	if err := os.WriteFile(path, content, 0o600); err != nil {
		d.t.Fatal(err)
	}
}

// do runs a command and gives what it said, on both outputs.
func (d *gridDesk) do(code int, args ...string) string {
	d.t.Helper()
	var out bytes.Buffer
	all := append([]string{"--config", filepath.Join(d.dir, "strayd.yaml"), "--now", "2026-03-10"}, args...)
	if got := run(d.t.Context(), all, &out, &out); got != code {
		d.t.Fatalf("%q: exit %d, want %d\n%s", args, got, code, out.String())
	}
	return out.String()
}

// The same book as text, as a workbook of either system of days and as a table of columns, packed in every way that is read, gives the same
// returns and the same flags, and the export of each is the same to the byte.
func TestGridsGoTheWholeWay(t *testing.T) {
	days, names, values := gridBook(t)
	want := ""
	for _, c := range []struct {
		name    string
		content []byte
	}{
		{"a.csv", bookCSV(days, names, values)},
		{"a.xlsx", bookXLSX(t, days, names, values, false)},
		{"b.xlsx", bookXLSX(t, days, names, values, true)},
		{"a.parquet", bookParquet(t, days, names, values)},
		{"b.parquet", bookParquet(t, days, names, values, parquet.Compression(&parquet.Snappy), parquet.MaxRowsPerRowGroup(100))},
		{"c.parquet", bookParquet(t, days, names, values, parquet.Compression(&parquet.Zstd), parquet.PageBufferSize(300))},
		{"d.parquet", bookParquet(t, days, names, values, parquet.Compression(&parquet.Gzip), parquet.DataPageVersion(1))},
	} {
		d := newGridDesk(t, filepath.Ext(c.name))
		d.lay("inbox/"+c.name, c.content)
		if said := d.do(exitDone, "check", "--settled"); !strings.Contains(said, "280 rows from 2025-12-01 to 2026-03-06") {
			t.Errorf("%s: check says\n%s", c.name, said)
		}
		if said := d.do(exitDone, "pass", "--settled"); !strings.Contains(said, "280 new") {
			t.Errorf("%s: pass says\n%s", c.name, said)
		}
		got := d.do(exitDone, "flags", "--format", "csv")
		if !strings.Contains(got, ",2026-03-06,birch,,breach,own,0.31,") {
			t.Errorf("%s: no flag on the planted value:\n%s", c.name, got)
		}
		got = strings.ReplaceAll(got, c.name, "FILE") + d.do(exitDone, "ledger", "export")
		got = withoutLines(got)
		if want == "" {
			want = got
		}
		if got != want {
			t.Errorf("%s: got\n%.2000s\nwant\n%.2000s", c.name, got, want)
		}
		// The same content again changes nothing, under whatever name.
		d.lay("inbox/z-again"+filepath.Ext(c.name), c.content)
		if said := d.do(exitDone, "pass", "--settled"); !strings.Contains(said, "0 files accepted, 0 refused") {
			t.Errorf("%s again: %s", c.name, said)
		}
	}
}

// withoutLines takes the column of the line out of the listing of flags: rows of a table of columns count without the header.
func withoutLines(listing string) string {
	head, rest, _ := strings.Cut(listing, "\n")
	at := slices.Index(strings.Split(head, ","), "line")
	var b strings.Builder
	for line := range strings.Lines(rest) {
		cells := strings.Split(line, ",")
		if len(cells) > at {
			cells[at] = ""
		}
		b.WriteString(strings.Join(cells, ","))
	}
	return b.String()
}

// A file that is cut off anywhere is refused, and nothing of it is kept.
func TestGridsCutOff(t *testing.T) {
	days, names, values := gridBook(t)
	for _, c := range []struct {
		ext     string
		content []byte
	}{{".xlsx", bookXLSX(t, days, names, values, false)}, {".parquet", bookParquet(t, days, names, values, parquet.Compression(&parquet.Snappy))}} {
		d := newGridDesk(t, c.ext)
		for i := range 6 {
			cut := len(c.content) * (2*i + 1) / 12
			d.lay("inbox/cut"+c.ext, c.content[:cut])
			said := d.do(exitFailed, "pass", "--settled")
			if !strings.Contains(said, "refused, nothing of it is kept: cut"+c.ext+": ") || !strings.Contains(said, "cut off") {
				t.Errorf("%s cut at byte %d: %s", c.ext, cut, said)
			}
		}
		if got := d.do(exitDone, "ledger", "export"); strings.Count(got, "\n") != 1 {
			t.Errorf("%s: something was kept:\n%s", c.ext, got)
		}
		d.lay("inbox/cut"+c.ext, c.content)
		d.do(exitDone, "pass", "--settled")
	}
}
