package weekly

import (
	"fmt"
	"io"
	"strings"
	"unicode/utf8"

	"strayd/rules"
)

// Text writes the log for a terminal or a plain message.
func Text(w io.Writer, l *rules.WeekLog) error {
	p := newPage(l)
	var b strings.Builder
	fmt.Fprintf(&b, "WEEKLY LOG %s  %s\n", p.Week, p.Dates)
	fmt.Fprintf(&b, "%s\n", p.Sentence)
	for _, line := range p.Head {
		fmt.Fprintf(&b, "%s\n", line)
	}
	b.WriteString("\nAT A GLANCE (in brackets the week before, here and in every table)\n")
	writeFigures(&b, p.First)
	for _, s := range p.Sections {
		fmt.Fprintf(&b, "\n%s\n", strings.ToUpper(s.Title))
		writeFigures(&b, s.Figures)
		for i := range s.Tables {
			writeTable(&b, &s.Tables[i])
		}
		writeNotes(&b, s.Notes)
	}
	b.WriteString("\nCAUTIONS\n")
	writeNotes(&b, p.Cautions)
	_, err := io.WriteString(w, b.String())
	return err
}

func writeFigures(b *strings.Builder, figures []figure) {
	width := 0
	for _, f := range figures {
		width = max(width, utf8.RuneCountInString(f.Label))
	}
	for _, f := range figures {
		fmt.Fprintf(b, "  %s  %s\n", padded(f.Label, width), f.Cell.Said())
	}
}

// noteWidth is how long a line of words is.
const noteWidth = 120

// writeNotes writes sentences, broken at spaces.
func writeNotes(b *strings.Builder, notes []string) {
	for _, n := range notes {
		line := " "
		for _, word := range strings.Fields(n) {
			if utf8.RuneCountInString(line)+1+utf8.RuneCountInString(word) > noteWidth {
				fmt.Fprintln(b, line)
				line = "   "
			}
			line += " " + word
		}
		fmt.Fprintln(b, line)
	}
}

func padded(s string, width int) string {
	return s + strings.Repeat(" ", max(0, width-utf8.RuneCountInString(s)))
}

// writeTable lines up the rows; the last column is not padded.
func writeTable(b *strings.Builder, t *table) {
	fmt.Fprintf(b, "  %s:", t.Title)
	if len(t.Rows) == 0 {
		fmt.Fprintf(b, " %s\n", t.Empty)
		return
	}
	b.WriteString("\n")
	rows := [][]string{t.Head}
	for _, r := range t.Rows {
		texts := []string{r.Subject.Text}
		for _, c := range r.Cells {
			texts = append(texts, c.String())
		}
		rows = append(rows, texts)
	}
	widths := make([]int, len(t.Head))
	for _, r := range rows {
		for i, s := range r {
			widths[i] = max(widths[i], utf8.RuneCountInString(s))
		}
	}
	for _, r := range rows {
		line := "   "
		for i, s := range r {
			line += " " + padded(s, widths[i]) + " "
		}
		fmt.Fprintf(b, "%s\n", strings.TrimRight(line, " "))
	}
}

// Lines are the log as a message: eight lines or fewer, the first complete alone. where says where the whole of it is, "" for nowhere.
func Lines(l *rules.WeekLog, where string) []string {
	p := newPage(l)
	lines := []string{fmt.Sprintf("WEEKLY LOG %s: %s", p.Week, p.Sentence)}
	lines = append(lines, p.Head[0])
	b := builder{l.Now, l.Last, l.Zone}
	for _, s := range []*section{b.flags(), b.ageing(), b.closed(), b.feeds()} {
		var words []string
		for _, f := range s.Figures {
			if f.first && len(words) < 2 {
				words = append(words, f.Label+": "+f.Cell.Said())
			}
		}
		lines = append(lines, strings.Join(words, "; "))
	}
	if l.Now.Head != "" {
		lines = append(lines, "Head of the record: "+l.Now.Head)
	}
	if where != "" {
		lines = append(lines, "The whole log: "+where)
	}
	return lines
}
