package main

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"strings"
	"unicode/utf8"

	"strayd/rules"
)

// caution goes with whatever could be taken for a finding.
const caution = "A flag is a statistical statement about past data: neither advice nor a finding of error; no flag is no certificate."

// percent writes a return for a person: signed per cent with two decimals, basis points under 0.1 %.
func percent(v float64) string {
	if a := math.Abs(v); a != 0 && a < 0.001 {
		return fmt.Sprintf("%+.2f bp", v*1e4)
	}
	return fmt.Sprintf("%+.2f %%", v*100)
}

func percentNum(n rules.Num) string {
	if !n.OK {
		return "-"
	}
	return percent(n.V)
}

// width writes a size, such as a deviation, without a sign.
func width(n rules.Num) string {
	return strings.TrimPrefix(percentNum(n), "+")
}

// between writes a range with one or both of its lines.
func between(low, high rules.Num) string {
	switch {
	case low.OK && high.OK:
		return percent(low.V) + " to " + percent(high.V)
	case low.OK:
		return "above " + percent(low.V)
	case high.OK:
		return "below " + percent(high.V)
	}
	return "-"
}

// rarest is the longest waiting time that is printed for a person: own data cannot support more.
const rarest = 5000

// onceIn writes a tail probability as a waiting time.
func onceIn(tail rules.Num) string {
	if !tail.OK || tail.V <= 0 {
		return "-"
	}
	days := 1 / tail.V
	switch {
	case days >= rarest:
		return fmt.Sprintf("rarer than 1 in %s", thousands(rarest))
	case days < 1.5:
		return "every day"
	}
	return fmt.Sprintf("once in %s days", thousands(int(math.Round(days))))
}

// day writes a date with its weekday.
func day(d rules.Date) string {
	if d == rules.NoDate {
		return "-"
	}
	return d.Time().Format("Mon 2006-01-02")
}

// printable makes a text from a file safe for a terminal.
func printable(s string) string {
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || r >= 0x80 && r < 0xa0 || r >= 0x202a && r <= 0x202e || r >= 0x2066 && r <= 0x2069 {
			return '?'
		}
		return r
	}, s)
}

// table lines up rows of cells for a person; the last cell of a row is not padded.
type table struct {
	w    io.Writer
	rows [][]string
}

func columns(w io.Writer) *table { return &table{w: w} }

func fields(t *table, texts ...string) { t.rows = append(t.rows, texts) }

// Flush writes the rows.
func (t *table) Flush() error {
	var widths []int
	for _, row := range t.rows {
		for i, text := range row {
			if i == len(widths) {
				widths = append(widths, 0)
			}
			widths[i] = max(widths[i], utf8.RuneCountInString(text))
		}
	}
	out := bufio.NewWriter(t.w)
	for _, row := range t.rows {
		line := ""
		for i, text := range row {
			line += fmt.Sprintf("%-*s  ", widths[i], text)
		}
		fmt.Fprintln(out, strings.TrimRight(line, " "))
	}
	return out.Flush()
}
