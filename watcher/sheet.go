package watcher

import "strayd/rules"

// Sheet is the validated content of one file, in columns.
type Sheet struct {
	File     File
	What     What
	Names    *Names // those held, then those new in this file
	Held     int    // how many of Names the ledger had when the file was read
	Columns  []*Column
	Rows     int         // data rows accepted, a repeated identical row counted once
	Repeated int         // rows that repeated an earlier row of the file exactly
	Skipped  int         // bad rows left out under bad_rows: skip
	Missing  int         // values that are a missing token
	Terms    []CellTerms // see SortTerms; values without an entry have the ordinary ones
	Days     bool        // the file has a column of the days that values cover
	Status   bool        // the file has a column that says estimate or final
	Unended  bool        // the last line has no newline, and nobody says that the file is whole
	Notes    []string
}

// File is which file a sheet was read from.
type File struct {
	Feed   string
	Name   string // base name
	Size   int64
	SHA256 [32]byte // of the bytes as they lie on disk
}

// First and Last are the first and the last date of the sheet, NoDate when it is empty.
func (s *Sheet) First() rules.Date {
	if len(s.Columns) == 0 {
		return rules.NoDate
	}
	return s.Columns[0].Date
}

// Last is the newest date of the sheet.
func (s *Sheet) Last() rules.Date {
	if len(s.Columns) == 0 {
		return rules.NoDate
	}
	return s.Columns[len(s.Columns)-1].Date
}

// BadFile is why a file was refused: where in the file, what stood there, and what is wrong with it.
type BadFile struct {
	File   File
	Line   int    // from 1; 0 when the whole file is meant
	Column int    // byte column of the cell, from 1; 0 when the whole line is meant
	Where  string // in the words of a file that is no text, in place of line and column
	Cell   string
	Date   rules.Date // the file's date where it is known, else NoDate
	Reason string

	Ask       string      // what to ask the provider for; "" where the reason says it all
	LooksLike rules.Cause // "" for nothing
	Gate      bool        // refused by what is held, not by its form: a person may release it
}

// Error is file:line:column: reason, with the cell's text quoted and cut.
func (b *BadFile) Error() string { return b.Place() + ": " + b.Message() }
