package main

import (
	"bufio"
	"fmt"
	"io"
	"strings"
	"unicode/utf8"

	"strayd/rules"
)

// caution goes with whatever could be taken for a finding.
const caution = "A flag is a statistical statement about past data: neither advice nor a finding of error; no flag is no certificate."

// percentNum writes a return that may be absent.
func percentNum(n rules.Num) string {
	if !n.OK {
		return "-"
	}
	return rules.InPercent(n.V)
}

// width writes a size, such as a deviation, without a sign.
func width(n rules.Num) string {
	return strings.TrimPrefix(percentNum(n), "+")
}

// between writes a range with one or both of its lines.
func between(low, high rules.Num) string { return orDash(rules.Between(low, high)) }

// onceIn writes a tail probability as a waiting time.
func onceIn(tail rules.Num) string {
	if !tail.OK || tail.V <= 0 {
		return "-"
	}
	return rules.OnceIn(tail.V)
}

func orDash(s string) string {
	if s == "" {
		return "-"
	}
	return s
}

// day writes a date with its weekday.
func day(d rules.Date) string {
	if d == rules.NoDate {
		return "-"
	}
	return d.Day()
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
