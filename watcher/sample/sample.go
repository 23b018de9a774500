package sample

import (
	"fmt"
	"strings"

	"strayd/rules"
)

// Sample is the beginning of one file.
type Sample struct {
	Name   string
	Header []string
	Line   int // of the header
	Rows   []Row
	Cut    bool // the file goes on

	Encoding  string
	Separator byte // 0 where cells are not parted by a character
	parted    Remark
	encoded   Remark
	Typed     bool // the cells know whether they are dates or numbers
	Percent   bool // numbers are shown as per cent, and hold fractions
}

// Row is one row after the header.
type Row struct {
	Line  int
	Cells []string
}

// Sureness is how well a remark is founded.
type Sureness string

// The degrees of sureness.
const (
	Sure   Sureness = "sure"
	Likely Sureness = "likely"
	Guess  Sureness = "a guess"
)

// Remark says of a key of the declaration what it rests on.
type Remark struct {
	Key     string
	Sure    Sureness
	Why     string
	Confirm bool // a person must look, since the samples cannot prove it
}

// Finding is a declaration that would read the samples. Name, folder and pattern are the caller's.
type Finding struct {
	Feed    rules.Feed
	Remarks []Remark // in the order of the configuration's keys
}

// Of is the remark on a key.
func (f *Finding) Of(key string) Remark {
	for _, r := range f.Remarks {
		if r.Key == key {
			return r
		}
	}
	return Remark{}
}

// Unreadable is why no declaration would read a sample.
type Unreadable struct {
	Name   string
	Line   int // 0 where the whole file is meant
	Reason string
}

// Error is file:line: reason.
func (u *Unreadable) Error() string {
	if u.Line > 0 {
		return fmt.Sprintf("%s:%d: %s", u.Name, u.Line, u.Reason)
	}
	return u.Name + ": " + u.Reason
}

// place says where a cell stands, with the file's name where there are several.
type place struct {
	sample *Sample
	line   int
	cell   string
}

func (p place) in(samples []*Sample) string {
	if len(samples) > 1 {
		return fmt.Sprintf("%s:%d, %q,", p.sample.Name, p.line, p.cell)
	}
	return fmt.Sprintf("line %d, %q,", p.line, p.cell)
}

// Look finds the declaration that reads all the samples, which have the same header. newest is the last day that a valuation date may be.
// The error is *Unreadable.
func Look(samples []*Sample, newest rules.Date) (*Finding, error) {
	for _, s := range samples {
		if len(s.Rows) == 0 {
			return nil, &Unreadable{s.Name, 0, "a header without rows shows neither dates nor numbers; give a file with some"}
		}
	}
	first := samples[0]
	f := &Finding{Feed: rules.Feed{Encoding: first.Encoding, Separator: first.Separator}}
	t := newTable(samples)
	at, err := f.dates(t, newest)
	if err != nil {
		return nil, err
	}
	if err := f.layout(t, at); err != nil {
		return nil, err
	}
	f.values(t)
	if first.Separator != 0 {
		f.Remarks = append(f.Remarks, first.parted, first.encoded)
	}
	return f, nil
}

// table is all rows of the samples by column.
type table struct {
	samples []*Sample
	header  []string
	columns []*column

	date   int   // index of the column of the dates
	series int   // of a long file
	value  []int // the columns that hold values
}

// column is what stands in one column of all samples.
type column struct {
	name   string
	cells  []place
	kind   kind
	number numbers
}

func newTable(samples []*Sample) *table {
	t := &table{samples: samples, header: samples[0].Header, series: -1}
	for i, name := range t.header {
		c := &column{name: name}
		for _, s := range samples {
			for _, r := range s.Rows {
				if i < len(r.Cells) {
					c.cells = append(c.cells, place{s, r.Line, strings.TrimSpace(r.Cells[i])})
				}
			}
		}
		c.look()
		t.columns = append(t.columns, c)
	}
	return t
}

// hinted says whether the name of a column holds one of the words.
func (c *column) hinted(words ...string) bool {
	name := strings.ToLower(c.name)
	for _, w := range words {
		if strings.Contains(name, w) {
			return true
		}
	}
	return false
}
