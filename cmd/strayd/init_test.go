package main

import (
	"bytes"
	"compress/gzip"
	"encoding/csv"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
	"unicode/utf16"
)

// shape is one way to write a book into a file.
type shape struct {
	wide, gz        bool
	comma           string
	decimal, date   string // date: layout of package time
	unit, encoding  string
	before, between int // other columns
}

func randomShape(r *rand.Rand) shape {
	pick := func(from ...string) string { return from[r.IntN(len(from))] }
	s := shape{wide: r.IntN(2) == 0, gz: r.IntN(5) == 0, comma: pick(",", ";", "\t", "|"), decimal: pick(".", ","), unit: pick("fraction", "percent", "bp"),
		date: pick("2006-01-02", "02/01/2006", "01/02/2006", "02.01.2006", "20060102", "02-Jan-2006", "2006/01/02", "02 Jan 06"), encoding: pick("utf-8", "utf-16", "latin-1")}
	if s.comma == "," {
		s.decimal = "."
	}
	if !s.wide {
		s.before, s.between = r.IntN(2), r.IntN(2)
	}
	return s
}

// value is a return of some hundred-thousandths in the unit of the shape, exactly.
func (s shape) value(n int) string {
	places := map[string]int{"fraction": 5, "percent": 3, "bp": 1}[s.unit]
	sign, digits := "", fmt.Sprintf("%06d", max(n, -n))
	if n < 0 {
		sign = "-"
	}
	whole := strings.TrimLeft(digits[:len(digits)-places], "0")
	if whole == "" {
		whole = "0"
	}
	return sign + whole + s.decimal + digits[len(digits)-places:]
}

// text writes the book: values[day][series].
func (s shape) text(days []time.Time, names []string, values [][]int) string {
	var rows [][]string
	if s.wide {
		rows = append(rows, append([]string{"Datum"}, names...))
		for d, day := range days {
			row := []string{day.Format(s.date)}
			for i := range names {
				row = append(row, s.value(values[d][i]))
			}
			rows = append(rows, row)
		}
	} else {
		pad := func(date, series, value string, n int) []string {
			row := slices.Repeat([]string{"USD"}, s.before)
			return append(append(append(row, date), slices.Repeat([]string{fmt.Sprintf("note %d", n%3)}, s.between)...), series, value)
		}
		header := pad("date", "fund", "return", 0)
		for i := range s.before + 1 + s.between {
			if i != s.before {
				header[i] = fmt.Sprintf("other%d", i)
			}
		}
		rows = append(rows, header)
		for d, day := range days {
			for i, name := range names {
				rows = append(rows, pad(day.Format(s.date), name, s.value(values[d][i]), i))
			}
		}
	}
	var b strings.Builder
	for _, row := range rows {
		b.WriteString(strings.Join(row, s.comma) + "\n")
	}
	return b.String()
}

// bytes encodes and packs the text.
func (s shape) bytes(t *testing.T, text string) []byte {
	b := []byte(text)
	switch s.encoding {
	case "utf-16":
		b = []byte{0xFF, 0xFE}
		for _, u := range utf16.Encode([]rune(text)) {
			b = append(b, byte(u), byte(u>>8))
		}
	case "latin-1":
		b = nil
		for _, r := range text {
			b = append(b, byte(r))
		}
	}
	if !s.gz {
		return b
	}
	var packed bytes.Buffer
	z := gzip.NewWriter(&packed)
	if _, err := z.Write(b); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return packed.Bytes()
}

// A book of known returns, written in any of the ways in use, comes through init and pass exactly: no order of the date, unit, mark or
// column is taken for another.
func TestInitReadsWhatWasWritten(t *testing.T) {
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	rng := rand.New(rand.NewPCG(seed, 1))
	names := []string{"Alder Zürich", "birch-2", "Cedar & Co", "dale_reserve"}
	for range 25 {
		s := randomShape(rng)
		var days []time.Time
		for day := time.Date(2026, 1, 5, 0, 0, 0, 0, time.UTC); len(days) < 30; day = day.AddDate(0, 0, 1) {
			if day.Weekday() != time.Saturday && day.Weekday() != time.Sunday {
				days = append(days, day)
			}
		}
		var want []string
		values := make([][]int, len(days))
		for d, day := range days {
			for _, name := range names {
				n := int(500 * rng.NormFloat64())
				values[d] = append(values[d], n)
				want = append(want, fmt.Sprintf("%s %s %s", day.Format(time.DateOnly), name, shortDecimal(n)))
			}
		}
		file := "book.csv"
		if s.gz {
			file += ".gz"
		}
		got, err := throughInit(t, file, s.bytes(t, s.text(days, names, values)))
		if err != nil {
			t.Fatalf("%+v: %v", s, err)
		}
		slices.Sort(want)
		if !slices.Equal(got, want) {
			t.Fatalf("%+v: the ledger holds\n%s\nwant\n%s", s, strings.Join(got, "\n"), strings.Join(want, "\n"))
		}
	}
}

// shortDecimal is n hundred-thousandths as the export writes it.
func shortDecimal(n int) string {
	s := shape{unit: "fraction", decimal: "."}.value(n)
	if n == 0 {
		return "0"
	}
	return strings.TrimRight(s, "0")
}

// throughInit lays a file into a fresh folder, has a configuration written from it, passes over it and gives what the ledger then holds.
func throughInit(t *testing.T, file string, content []byte) ([]string, error) {
	t.Helper()
	dir := t.TempDir()
	path := filepath.Join(dir, file)
	if err := os.WriteFile(path, content, 0o600); err != nil {
		return nil, err
	}
	conf := filepath.Join(dir, "strayd.yaml")
	var out, said bytes.Buffer
	for _, args := range [][]string{{"init", path}, {"check", "--settled"}, {"pass", "--settled"}, {"ledger", "export"}} {
		out.Reset()
		if code := run(t.Context(), append([]string{"--config", conf, "--now", "2026-03-16"}, args...), &out, &said); code != exitDone {
			return nil, fmt.Errorf("%q: exit %d: %s%s", args, code, out.String(), said.String())
		}
	}
	rows, err := csv.NewReader(&out).ReadAll()
	if err != nil {
		return nil, err
	}
	var got []string
	for _, r := range rows[1:] {
		got = append(got, r[0]+" "+r[1]+" "+r[2])
	}
	slices.Sort(got)
	return got, nil
}
