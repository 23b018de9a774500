package feed

import (
	"fmt"
	"io"
	"os"
	"path"
	"strconv"
	"strings"

	"strayd/rules"
	"strayd/watcher"
)

// gridComma parts the cells of a grid that is laid out as text. It is in no text that people write.
const gridComma = '\x1f'

// gridText lays a grid out as lines of text, a line a row, so that a grid goes through the same hands as any other file. Dates come in the
// feed's own style and numbers with its decimal mark; a text stays as it is, and is read as the feed declares.
type gridText struct {
	watcher.Grid
	plan  *plan
	spare []byte
	width int // cells of the header
	row   int // of the last line
	begun bool
	zero  bool // the header is no row of its own
	fault *watcher.GridFault
}

// openGrid opens a file as a grid where its name says that it is one.
func (m *merger) openGrid(file *os.File, c watcher.Candidate, opt Options) error {
	open := opt.Grids[strings.ToLower(path.Ext(c.Name))]
	if open == nil {
		return nil
	}
	m.comma, m.asGrid = gridComma, true
	m.setMost()
	g, err := open(file, c.Size, m.feed.Sheet, watcher.GridBounds{Bytes: opt.Limits.TextBytes, Ratio: opt.Limits.Ratio, Columns: opt.Limits.Columns})
	if fault, ok := err.(*watcher.GridFault); ok {
		return refusal(fault.Reason)
	} else if err != nil {
		return err
	}
	m.grid = &gridText{Grid: g, plan: m.plan}
	m.style.from1904 = g.From1904()
	return nil
}

// Read gives the next lines.
func (g *gridText) Read(p []byte) (int, error) {
	for len(g.spare) < 1<<12 {
		cells, row, err := g.Next()
		if fault, ok := err.(*watcher.GridFault); ok {
			g.fault, err = fault, io.EOF // what stands before it is looked at first
		}
		if err == io.EOF && len(g.spare) > 0 {
			break
		}
		if err != nil {
			return 0, err
		}
		g.line(cells, row)
	}
	n := copy(p, g.spare)
	g.spare = g.spare[:copy(g.spare, g.spare[n:])]
	return n, nil
}

// line adds a row, after empty lines for the rows that are left out.
func (g *gridText) line(cells []watcher.GridCell, row int) {
	for len(cells) > 0 && cells[len(cells)-1].Text == "" && cells[len(cells)-1].Kind != watcher.DateCell {
		cells = cells[:len(cells)-1]
	}
	header := !g.begun
	if header {
		g.begun, g.zero, g.width = true, row == 0, len(cells)
	}
	for g.row++; g.row < row; g.row++ {
		g.spare = append(g.spare, '\n')
	}
	if header && g.zero {
		g.row = 0
	}
	for i, c := range cells {
		if i > 0 {
			g.spare = append(g.spare, gridComma)
		}
		g.cell(c, header)
	}
	if total := len(cells) > 0 && strings.HasPrefix(cells[0].Text, "#"); !total || len(cells) > 1 {
		for range g.width - len(cells) {
			g.spare = append(g.spare, gridComma)
		}
	}
	g.spare = append(g.spare, '\n')
}

func (g *gridText) cell(c watcher.GridCell, header bool) {
	text := c.Text
	switch c.Kind {
	case watcher.DateCell:
		text = g.plan.style.write(c.Date)
	case watcher.NumberCell, watcher.PercentCell:
		if g.plan.mark != '.' {
			text = strings.Replace(text, ".", string(rune(g.plan.mark)), 1)
		}
		if c.Kind == watcher.PercentCell && (g.plan.shift > 0 || g.plan.price) {
			text += "%"
		}
	default:
		if header {
			text = strings.Join(strings.FieldsFunc(text, func(r rune) bool { return r == '\n' || r == '\r' }), " ")
		}
	}
	if !strings.ContainsAny(text, "\"\n\r\x1f") {
		g.spare = append(g.spare, text...)
		return
	}
	g.spare = append(g.spare, '"')
	g.spare = append(g.spare, strings.ReplaceAll(text, `"`, `""`)...)
	g.spare = append(g.spare, '"')
}

// write writes a date in the style.
func (s *dateStyle) write(d rules.Date) string {
	if s.excel {
		n := int(d) - excelShift
		if s.from1904 {
			return strconv.Itoa(n - shift1904)
		}
		if n <= 60 {
			n--
		}
		return strconv.Itoa(n)
	}
	t := d.Time()
	var b strings.Builder
	for _, k := range s.tokens {
		switch k.kind {
		case 'Y':
			fmt.Fprintf(&b, "%04d", t.Year())
		case 'y':
			fmt.Fprintf(&b, "%02d", t.Year()%100)
		case 'M':
			fmt.Fprintf(&b, "%02d", t.Month())
		case 'D':
			fmt.Fprintf(&b, "%02d", t.Day())
		case 'N':
			b.WriteString(t.Month().String()[:3])
		default:
			b.WriteByte(k.literal)
		}
	}
	return b.String()
}

// column is the place of a cell that begins at a byte of the line that begins at start: the byte, or in a grid the cell; from 1.
func (c *cursor) column(at, start int) int {
	if !c.flat {
		return at - start + 1
	}
	column, quotes := 1, 0
	for _, b := range c.text[start:at] {
		if b == '"' {
			quotes++
		} else if b == c.sep && quotes%2 == 0 {
			column++
		}
	}
	return column
}

// place puts a fault where it belongs: line and column, and in a grid the words for them.
func (m *merger) place(b *watcher.BadFile, f *fault) {
	b.Line, b.Column, b.Cell, b.Reason = int(f.line), f.column, f.cell, f.reason
	if m.grid != nil && (b.Line > 0 || b.Column > 0) {
		b.Where = m.grid.Place(b.Line, b.Column-1)
	}
}

// gridEnd takes what a grid found wrong after all rows that it gave, and says whether there is something.
func (m *merger) gridEnd() bool {
	f := m.grid.fault
	if f == nil || m.bad != nil {
		return false
	}
	m.bad = &fault{cell: f.Cell, reason: f.Reason}
	if f.Row >= 0 {
		m.bad.line, m.bad.column = uint32(f.Row), f.Column+1
	}
	return true
}
