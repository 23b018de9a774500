package spreadsheet

import (
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"time"

	"github.com/xuri/excelize/v2"

	"strayd/rules"
	"strayd/watcher"
)

// grid is an open sheet.
type grid struct {
	book     *excelize.File
	sheet    string
	from1904 bool
	columns  int // at most
	rows     []row
	width    int // columns
	next     int // of rows
	cells    []watcher.GridCell
	styles   map[int]watcher.CellKind // of numbers, by the number of their style
	notes    []string
}

// row is a row that has something in it.
type row struct {
	number int
	values []string
}

// load reads the sheet: as a stream for its values, then whole, which alone says where it is broken.
func (g *grid) load() error {
	props, err := g.book.GetWorkbookProps()
	if err != nil {
		return err
	}
	g.from1904 = props.Date1904 != nil && *props.Date1904
	hidden, err := g.stream()
	if err != nil {
		return err
	}
	merged, err := g.book.GetMergeCells(g.sheet, true)
	if err != nil {
		return err
	}
	g.note(hidden, "row", "hidden and read like any other")
	g.note(len(merged), "merged range", "of which only the first cell has a value")
	out := 0
	for c := range g.width {
		name, err := excelize.ColumnNumberToName(c + 1)
		if err != nil {
			return err
		}
		shown, err := g.book.GetColVisible(g.sheet, name)
		if err != nil {
			return err
		}
		if !shown {
			out++
		}
	}
	g.note(out, "column", "hidden and read like any other")
	return nil
}

func (g *grid) note(n int, what, how string) {
	if n > 0 {
		g.notes = append(g.notes, fmt.Sprintf("sheet %q has %s %s", g.sheet, rules.Counted(n, what), how))
	}
}

// stream reads all values as they are kept.
func (g *grid) stream() (hidden int, err error) {
	rows, err := g.book.Rows(g.sheet)
	if err != nil {
		return 0, err
	}
	for number := 1; rows.Next(); number++ {
		values, err := rows.Columns(excelize.Options{RawCellValue: true})
		if err != nil {
			return 0, err
		}
		if len(values) == 0 {
			continue
		}
		if g.width = max(g.width, len(values)); g.width > g.columns {
			return 0, unfit("sheet %q has more than %d columns, the limit; deliver CSV or Parquet", g.sheet, g.columns)
		}
		if rows.GetRowOpts().Hidden {
			hidden++
		}
		g.rows = append(g.rows, row{number, values})
	}
	return hidden, rows.Close()
}

// Next implements watcher.Grid.
func (g *grid) Next() (cells []watcher.GridCell, number int, err error) {
	err = guarded(func() error {
		for g.next < len(g.rows) {
			r := g.rows[g.next]
			g.rows[g.next].values = nil
			g.next++
			filled := false
			g.cells = g.cells[:0]
			for i := range g.width {
				value := "" // what is blank is looked at too: something may be lost there
				if i < len(r.values) {
					value = r.values[i]
				}
				c, err := g.cell(r.number, i, value)
				if err != nil {
					return err
				}
				filled = filled || c.Text != "" || c.Kind == watcher.DateCell
				g.cells = append(g.cells, c)
			}
			if filled {
				cells, number = g.cells, r.number
				return nil
			}
		}
		return io.EOF
	})
	return cells, number, err
}

// cell says what a value is, by the type and format of its cell.
func (g *grid) cell(row, column int, value string) (c watcher.GridCell, err error) {
	name, err := excelize.CoordinatesToCellName(column+1, row)
	if err != nil {
		return c, err
	}
	if value == "" {
		return c, g.empty(row, column, name)
	}
	kind, err := g.book.GetCellType(g.sheet, name)
	if err != nil {
		return c, err
	}
	switch kind {
	case excelize.CellTypeUnset, excelize.CellTypeNumber:
		return g.number(name, value)
	case excelize.CellTypeBool:
		value = map[string]string{"1": "TRUE", "0": "FALSE"}[value]
	case excelize.CellTypeDate:
		if d, err := rules.ParseDate(strings.TrimSuffix(value, "T00:00:00")); err == nil {
			return watcher.GridCell{Kind: watcher.DateCell, Date: d}, nil
		}
	}
	return watcher.GridCell{Text: value}, nil
}

// empty refuses a cell whose value is not there though it should be: a formula that nobody computed, a text that is not in the list.
func (g *grid) empty(row, column int, name string) error {
	kind, err := g.book.GetCellType(g.sheet, name)
	if err != nil {
		return err
	}
	if kind == excelize.CellTypeSharedString {
		_, err := g.book.GetCellValue(g.sheet, name)
		return err
	}
	formula, err := g.book.GetCellFormula(g.sheet, name)
	if err != nil || formula == "" || kind == excelize.CellTypeFormula {
		return err
	}
	return &watcher.GridFault{Row: row, Column: column, Cell: "=" + formula,
		Reason: "the cell holds a formula without its value; open the workbook in a spreadsheet program and save it, or deliver values"}
}

// number reads a number, or the day that it is formatted as.
func (g *grid) number(name, value string) (watcher.GridCell, error) {
	style, err := g.book.GetCellStyle(g.sheet, name)
	if err != nil {
		return watcher.GridCell{}, err
	}
	kind, known := g.styles[style]
	if !known {
		if kind, err = g.format(style); err != nil {
			return watcher.GridCell{}, err
		}
		g.styles[style] = kind
	}
	if kind != watcher.DateCell {
		return watcher.GridCell{Kind: kind, Text: value}, nil
	}
	return g.day(value), nil
}

// day is the day of a serial number. With a time of the day, or out of the calendar, it is shown as it is and fits no style of a date.
func (g *grid) day(value string) watcher.GridCell {
	v, err := strconv.ParseFloat(value, 64)
	if err != nil || v != math.Trunc(v) || v < 0 || v > 2958465 || !g.from1904 && v == 60 { // 2958465 is 9999-12-31
		if err == nil && v >= 0 && v < 2958465 {
			seconds := int64(math.Round((v - math.Trunc(v)) * 86400))
			return watcher.GridCell{Text: g.date(int(v)).Time().Add(time.Duration(seconds) * time.Second).Format("2006-01-02T15:04:05")}
		}
		return watcher.GridCell{Text: "serial day " + value}
	}
	return watcher.GridCell{Kind: watcher.DateCell, Date: g.date(int(v))}
}

// Serial day 0 of both systems, counted from 1970-01-01; that of 1900 for serials after its 29 February 1900 (serial 60), which never
// was (ECMA-376, part 1, 18.17.4.1).
const (
	zero1900 = -25569
	zero1904 = -24107
)

func (g *grid) date(serial int) rules.Date {
	switch {
	case g.from1904:
		return rules.Date(serial + zero1904)
	case serial < 60:
		return rules.Date(serial + zero1900 + 1)
	}
	return rules.Date(serial + zero1900)
}

// Place implements watcher.Grid: Returns!C7, as formulas write it.
func (g *grid) Place(row, column int) string {
	if row <= 0 {
		return g.sheet
	}
	name, err := excelize.CoordinatesToCellName(column+1, row)
	if err != nil { // the whole row
		return fmt.Sprintf("%s!%d", g.sheet, row)
	}
	return g.sheet + "!" + name
}

// From1904 implements watcher.Grid.
func (g *grid) From1904() bool { return g.from1904 }

// Notes implements watcher.Grid.
func (g *grid) Notes() []string { return g.notes }

// Close implements watcher.Grid.
func (g *grid) Close() error { return g.book.Close() }
