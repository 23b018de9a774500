package main

import (
	"bufio"
	"encoding/csv"
	"encoding/json"
	"io"
	"math"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
)

// cell is one value of a listing: as CSV text, and as JSON.
type cell struct{ csv, json string }

var null = cell{"", "null"}

// text is a text cell. In CSV a text that a spreadsheet would take for a formula gets an apostrophe in front.
func text(s string) cell {
	if s == "" {
		return null
	}
	return cell{spreadsheetSafe(s), quoteJSON(s)}
}

func spreadsheetSafe(s string) string {
	if strings.ContainsRune("=+-@\t\r\n", rune(s[0])) {
		return "'" + s
	}
	return s
}

func quoteJSON(s string) string {
	b := new(strings.Builder)
	e := json.NewEncoder(b)
	e.SetEscapeHTML(false)
	if e.Encode(s) != nil {
		return `""`
	}
	return strings.TrimRight(b.String(), "\n")
}

func date(d rules.Date) cell { return text(d.String()) }

func moment(t time.Time) cell {
	if t.IsZero() {
		return null
	}
	return text(t.UTC().Format(time.RFC3339))
}

func integer[T ~int | ~uint32 | ~uint64](n T) cell {
	s := strconv.FormatUint(uint64(n), 10)
	return cell{s, s}
}

// units is an exact return.
func units(u rules.Units) cell {
	if u == rules.Missing {
		return null
	}
	return cell{u.String(), u.String()}
}

func number(n rules.Num) cell {
	if !n.OK {
		return null
	}
	s := shortest(n.V)
	return cell{s, s}
}

// shortest is the shortest decimal that reads back as the same float, with an exponent only for the very large and very small.
func shortest(v float64) string {
	if a := math.Abs(v); a != 0 && (a < 1e-6 || a >= 1e21) {
		return strconv.FormatFloat(v, 'e', -1, 64)
	}
	return strconv.FormatFloat(v, 'f', -1, 64)
}

// listing writes rows under fixed column names as CSV or JSON.
type listing struct {
	columns []string
	out     *bufio.Writer
	csv     *csv.Writer // nil for JSON
	rows    int
}

func newListing(w io.Writer, format, columns string) (*listing, error) {
	l := &listing{columns: strings.Split(columns, ","), out: bufio.NewWriterSize(w, 1<<16)}
	if format == "csv" {
		l.csv = csv.NewWriter(l.out)
		return l, l.csv.Write(l.columns)
	}
	return l, nil
}

func (l *listing) row(cells ...cell) error {
	l.rows++
	if l.csv != nil {
		record := make([]string, len(cells))
		for i, c := range cells {
			record[i] = c.csv
		}
		return l.csv.Write(record)
	}
	lead := ",\n"
	if l.rows == 1 {
		lead = "[\n"
	}
	_, err := l.out.WriteString(lead + object(l.columns, cells, "  ", " "))
	return err
}

// object writes one JSON object on one line.
func object(columns []string, cells []cell, indent, gap string) string {
	b := new(strings.Builder)
	b.WriteString(indent + "{")
	for i, c := range cells {
		if i > 0 {
			b.WriteString("," + gap)
		}
		b.WriteString(`"` + columns[i] + `":` + gap + c.json)
	}
	b.WriteString("}")
	return b.String()
}

func (l *listing) end() error {
	if l.csv != nil {
		l.csv.Flush()
		if err := l.csv.Error(); err != nil {
			return err
		}
		return l.out.Flush()
	}
	tail := "\n]\n"
	if l.rows == 0 {
		tail = "[]\n"
	}
	l.out.WriteString(tail) //nolint:errcheck // Flush reports it
	return l.out.Flush()
}

// formats are the values of --format.
func checkFormat(format string) error {
	switch format {
	case "table", "csv", "json":
		return nil
	}
	return usagef("--format %q: need table, csv or json", format)
}
