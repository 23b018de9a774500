package feed

import (
	"bytes"
	"math"

	"strayd/rules"
)

// run is a row of values of consecutive series on one date, at one number of decimals.
type run struct {
	date  rules.Date
	id    uint32 // of the first; the others follow. With fresh set, an index of the chunk's fresh names
	line  uint32 // of the first, within the chunk, from 0
	n     uint32
	dec   uint8
	fresh bool
}

// fault is what is wrong at a place, before the file's name and the chunk's first line are known.
type fault struct {
	line   uint32 // within the chunk, from 0
	column int
	cell   string
	reason string
	fatal  bool // nothing after it can be trusted
}

// chunk is a piece of text of whole records, and what a worker made of it.
type chunk struct {
	buf    []byte // reused
	text   []byte // within buf; ends in a newline
	at     int64  // where text begins in the file, about
	stride uint32 // lines from one value of a run to the next

	runs     []run
	vals     []int64
	fresh    [][]byte // names that were unknown when the chunk was parsed, in the order of the rows
	arena    []byte   // reused by the cursor
	lines    uint32
	terms    []rowTerms
	missing  int
	records  int       // rows
	trailers []trailer // control totals
	cells    int       // observations looked at, skipped ones included; under skip
	skipped  int
	bad      []fault // the first ones; when bad rows are not skipped, one and the last thing
	stop     bool    // the file ends with bad[len(bad)-1]
	err      error   // of the reader: there is no text
	done     chan struct{}
	panicked any // what parsing it panicked with
}

// mostFaults is how many skipped rows are named.
const mostFaults = 10

func (c *chunk) reset() {
	c.runs, c.vals, c.fresh, c.arena = c.runs[:0], c.vals[:0], c.fresh[:0], c.arena[:0]
	c.lines, c.missing, c.cells, c.skipped, c.bad, c.stop, c.err = 0, 0, 0, 0, nil, false, nil
	c.records, c.trailers, c.terms = 0, nil, c.terms[:0]
}

// emit adds a value to the last run when it continues it.
func (c *chunk) emit(date rules.Date, id, line uint32, v int64, dec uint8) {
	if k := len(c.runs) - 1; k >= 0 {
		r := &c.runs[k]
		if r.date == date && r.id+r.n == id && r.line+r.n*c.stride == line && !r.fresh {
			if w, ok := rescale(v, dec, r.dec); ok {
				r.n++
				c.vals = append(c.vals, w)
				return
			}
		}
	}
	c.runs = append(c.runs, run{date: date, id: id, line: line, n: 1, dec: dec})
	c.vals = append(c.vals, v)
}

// emitFresh adds a value of a series that has no number yet.
func (c *chunk) emitFresh(date rules.Date, name []byte, line uint32, v int64, dec uint8) {
	if k := len(c.fresh) - 1; k < 0 || !bytes.Equal(c.fresh[k], name) {
		c.fresh = append(c.fresh, name)
	}
	c.runs = append(c.runs, run{date: date, id: uint32(len(c.fresh) - 1), line: line, n: 1, dec: dec, fresh: true})
	c.vals = append(c.vals, v)
}

// rowTerms are the terms of a value where they are not the ordinary ones.
type rowTerms struct {
	date  rules.Date
	id    uint32 // of the series; with fresh set, an index of the chunk's fresh names
	fresh bool
	rules.Terms
}

// noteTerms notes the terms of the newest value.
func (c *chunk) noteTerms(date rules.Date, id uint32, fresh bool, t rules.Terms) {
	if fresh {
		id = uint32(len(c.fresh) - 1)
	}
	c.terms = append(c.terms, rowTerms{date, id, fresh, t})
}

// rescale gives v at more decimals, when they are the same or the result fits 32 bits.
func rescale(v int64, from, to uint8) (int64, bool) {
	if from == to {
		return v, true
	}
	if from > to {
		return 0, false
	}
	most := int64(math.MaxInt32 / rules.Pow10(int(to-from)))
	if v > most || v < -most {
		return 0, false
	}
	return v * int64(rules.Pow10(int(to-from))), true
}
