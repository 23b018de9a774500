package feed

import (
	"fmt"
	"io"
	"os"
	"path/filepath"

	"strayd/rules"
	"strayd/watcher"
)

// tableBytes is how large the register or the file of events may be.
const tableBytes = 256 << 20

// table is a small file of named columns, read row by row.
type table struct {
	plan   *plan
	file   string
	cur    cursor
	cells  []headerCell
	line   uint32 // of the row, from 1
	row    []headerCell
	failed *fault
}

// readTable reads the whole file and its header.
func readTable(path string, known, required []string) (*table, error) {
	text, err := readAll(path)
	if err != nil {
		return nil, err
	}
	o := Options{}.filled(false)
	p := &plan{amount: amount{mark: '.', places: rules.Places}, limits: o.Limits, comma: ','}
	p.style, err = parseStyle("YYYY-MM-DD")
	if err != nil {
		return nil, err
	}
	t := &table{plan: p, file: filepath.Base(path), cur: cursor{text: text, sep: ','}}
	for t.cur.at < len(text) && t.cur.blank() {
	}
	line := t.cur.line
	switch {
	case t.cur.at == len(text):
		t.failed = &fault{reason: "the file is empty"}
	default:
		if t.cells, t.failed = p.cells(&t.cur); t.failed == nil {
			t.failed = checkHeader(t.cells, known, required)
		}
		if t.failed != nil {
			t.failed.line = line + 1
		}
	}
	return t, t.err()
}

// readAll reads a file of UTF-8 text and gives it a last newline.
func readAll(path string) ([]byte, error) {
	file, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer file.Close()
	refuse := func(reason string) error {
		return &watcher.BadFile{File: watcher.File{Name: filepath.Base(path)}, Date: rules.NoDate, Reason: reason}
	}
	src, err := (&plan{}).decoded(io.LimitReader(file, tableBytes+1))
	if r, ok := err.(refusal); ok {
		return nil, refuse(string(r))
	} else if err != nil {
		return nil, err
	}
	text, err := io.ReadAll(src)
	if err != nil {
		return nil, err
	}
	if len(text) > tableBytes {
		return nil, refuse(fmt.Sprintf("the file has more than %d bytes, the limit", tableBytes))
	}
	return append(text, '\n'), nil
}

// next reads a row. It is false at the end and after a fault.
func (t *table) next() bool {
	for t.cur.at < len(t.cur.text) && t.cur.blank() {
	}
	if t.failed != nil || t.cur.at == len(t.cur.text) {
		return false
	}
	line := t.cur.line
	t.line = line + 1
	t.row, t.failed = t.plan.cells(&t.cur)
	if t.failed == nil && len(t.row) != len(t.cells) {
		t.failed = &fault{reason: fmt.Sprintf("the line has %d cells, the header has %d", len(t.row), len(t.cells))}
	}
	if t.failed != nil {
		t.failed.line = t.line
	}
	return t.failed == nil
}

// get is the cell of a column, empty where the file has no such column.
func (t *table) get(column string) string {
	if i := columnNamed(t.cells, column); i >= 0 {
		return string(t.row[i].name)
	}
	return ""
}

// fail refuses the row's cell, unless it has a fault already.
func (t *table) fail(column, reason string) {
	if t.failed != nil {
		return
	}
	t.failed = &fault{reason: reason}
	if i := columnNamed(t.cells, column); i >= 0 {
		t.failed = t.row[i].bad(reason)
	}
	t.failed.line = t.line
}

func (t *table) err() error {
	if t.failed == nil {
		return nil
	}
	f := t.failed
	return &watcher.BadFile{File: watcher.File{Name: t.file}, Line: int(f.line), Column: f.column, Cell: f.cell, Date: rules.NoDate,
		Reason: f.reason}
}
