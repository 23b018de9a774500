package weekly

import (
	"encoding/csv"
	"io"
	"strconv"
	"strings"

	"strayd/rules"
)

// columns are the header of the CSV form: one row a figure. value, of, last and last_of are for programs: numbers as shortest round-trip
// decimals, returns and shares as fractions, dates ISO, times RFC 3339; shown is the figure as text and page have it.
var columns = []string{"week", "section", "table", "subject", "figure", "value", "of", "last", "last_of", "shown"}

// CSV writes every figure of the log, safe to open in a spreadsheet.
func CSV(w io.Writer, l *rules.WeekLog) error {
	p := newPage(l)
	out := csv.NewWriter(w)
	if err := out.Write(columns); err != nil {
		return err
	}
	line := func(section, table, subject, figure string, c cell) error {
		shown := c.String()
		if table == "" {
			shown = c.Said()
		}
		record := []string{p.Week, section, table, subject, figure, c.Now.Raw, c.Of.Raw, c.Last.Raw, c.LastOf.Raw, shown}
		for i := range record {
			record[i] = safeCell(record[i])
		}
		return out.Write(record)
	}
	if err := line("verdict", "", "", "verdict", only(value{p.Sentence, p.Word})); err != nil {
		return err
	}
	for _, s := range p.Sections {
		if err := csvSection(s, line); err != nil {
			return err
		}
	}
	out.Flush()
	return out.Error()
}

func csvSection(s *section, line func(section, table, subject, figure string, c cell) error) error {
	for _, f := range s.Figures {
		if err := line(s.Key, "", "", f.Label, f.Cell); err != nil {
			return err
		}
	}
	for _, t := range s.Tables {
		for _, r := range t.Rows {
			if len(r.Cells) == 0 {
				if err := line(s.Key, t.Key, "", t.Head[0], only(r.Subject)); err != nil {
					return err
				}
			}
			for i, c := range r.Cells {
				if err := line(s.Key, t.Key, r.Subject.Raw, t.Head[i+1], c); err != nil {
					return err
				}
			}
		}
	}
	return nil
}

// safeCell puts an apostrophe in front of a text that a spreadsheet would take for a formula. A number, and a lone dash, are left.
func safeCell(s string) string {
	if s == "" || s == "-" || !strings.ContainsRune("=+-@\t\r\n", rune(s[0])) {
		return s
	}
	if _, err := strconv.ParseFloat(s, 64); err == nil {
		return s
	}
	return "'" + s
}
