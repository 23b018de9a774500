package watcher

import (
	"io"

	"strayd/rules"
)

// Grid is an open file of cells that is no text: a spreadsheet, or a table of columns. Its first row holds the names of the columns.
type Grid interface {
	// Next gives the next row that is not blank, and its number, which grows from row to row; io.EOF after the last. A header that is no
	// row of its own has number 0. The cells are valid until the next call. An error is a *GridFault when the file is refused.
	Next() (cells []GridCell, row int, err error)
	// Place says where a cell of a column, from 0, stands, or with -1 the whole row, in the words of those who use such files.
	Place(row, column int) string
	// From1904 says that serial days count from 1904-01-01, not from 1900.
	From1904() bool
	// Notes tells what a person should know of a file that is taken; to be asked for at its end.
	Notes() []string
	io.Closer
}

// GridCell is one cell.
type GridCell struct {
	Kind CellKind
	Text string     // as it is, or of a number with "." for its decimal mark; nothing for a cell without value
	Date rules.Date // of a DateCell
}

// CellKind is what a cell knows itself to be.
type CellKind uint8

// The kinds of cells.
const (
	TextCell    CellKind = iota // also truth values and errors, as they are shown
	NumberCell                  // a number
	PercentCell                 // a fraction that is shown as per cent
	DateCell                    // a day without a time
)

// GridFault is why a grid is refused.
type GridFault struct {
	Row, Column int // the row's number and the column from 0, -1 for the whole row; Row -1 for the whole file
	Cell        string
	Reason      string
}

// Error is the reason.
func (f *GridFault) Error() string { return f.Reason }

// GridBounds are what a grid may take of the machine.
type GridBounds struct {
	Bytes   int64 // of all its parts, decompressed
	Ratio   int64 // of decompressed to stored bytes, beyond the first MiB
	Columns int
}

// OpenGrid opens a file as a grid. table names the one to be read where a file can hold several; "" for the only one.
type OpenGrid func(file io.ReaderAt, size int64, table string, bounds GridBounds) (Grid, error)
