package feed

import (
	"fmt"

	"strayd/rules"
	"strayd/watcher"
)

// merger takes parsed chunks in the order of the file. It alone gives numbers to new series.
type merger struct {
	*plan
	*builder
	names   *watcher.Names
	grid    *gridText // nil where the file is text
	fresh   []uint32  // numbers of the chunk's fresh names
	line    uint64    // lines of the chunks taken
	newest  rules.Date
	terms   []watcher.CellTerms
	missing int
	cells   int
	skipped int
	faults  []fault // of skipped rows, with the lines of the file
	bad     *fault  // why the file is refused

	records  int
	trailers []trailer
}

// take adds what a chunk holds. Nothing more is taken once the file is refused.
func (m *merger) take(c *chunk) {
	if m.bad != nil {
		return
	}
	m.number(c.fresh)
	at := 0
	for _, r := range c.runs {
		vals := c.vals[at : at+int(r.n)]
		at += int(r.n)
		if r.fresh {
			r.id = m.fresh[r.id]
		}
		m.newest = max(m.newest, r.date)
		if clash := m.add(r, vals, uint32(m.line)+r.line+1, c.stride); clash != nil {
			m.bad = m.clashed(c, clash)
			return
		}
	}
	m.takeTerms(c)
	m.takeTrailers(c)
	m.missing += c.missing
	m.cells += c.cells
	m.skipped += c.skipped
	m.takeFaults(c)
	m.line += uint64(c.lines)
	m.checkBounds()
}

// number gives the series of a chunk that had no number theirs.
func (m *merger) number(fresh [][]byte) {
	m.fresh = m.fresh[:0]
	for _, name := range fresh {
		m.fresh = append(m.fresh, m.names.Add(name))
	}
}

// termsBytes is what the terms of a value take in memory.
const termsBytes = 32

func (m *merger) takeTerms(c *chunk) {
	for _, t := range c.terms {
		if t.fresh {
			t.id = m.fresh[t.id]
		}
		m.terms = append(m.terms, watcher.CellTerms{Date: t.date, Series: t.id, Terms: t.Terms})
	}
	m.bytes += termsBytes * int64(len(c.terms))
}

func (m *merger) takeFaults(c *chunk) {
	for _, f := range c.bad {
		f.line += uint32(m.line) + 1
		if len(m.faults) < mostFaults {
			m.faults = append(m.faults, f)
		}
		if c.stop {
			m.bad = &f
		}
	}
}

func (m *merger) checkBounds() {
	switch {
	case m.bad != nil:
	case m.line > uint64(m.limits.Lines):
		m.bad = &fault{reason: fmt.Sprintf("the file has more than %d lines, the limit", m.limits.Lines)}
	case m.bytes > m.limits.SheetBytes:
		m.bad = &fault{reason: fmt.Sprintf("the values of the file need more than %d bytes of memory, the limit: too many series "+
			"spread over too many dates; split the file", m.limits.SheetBytes)}
	}
}

// clashed finds the second value of a series and date again in the text of its chunk.
func (m *merger) clashed(c *chunk, clash *clash) *fault {
	bad := &fault{line: clash.line, reason: fmt.Sprintf("series %s has another value for %s on line %d of this file",
		watcher.QuoteCell(string(m.names.Name(clash.id))), clash.date, clash.oldLine)}
	cur := cursor{text: c.text, sep: m.comma, flat: m.asGrid}
	for target := clash.line - uint32(m.line) - 1; cur.line < target; {
		if _, problem := cur.record(); problem != "" {
			return bad
		}
	}
	for range m.valueAt(clash.id) {
		cur.cell()
		cur.separator()
	}
	bad.line = clash.line + cur.line - (clash.line - uint32(m.line) - 1)
	for cur.space(cur.text[cur.at]) {
		cur.at++
	}
	bad.column = cur.column(cur.at, cur.lineStart)
	cell, _ := cur.cell()
	bad.cell = string(cell)
	return bad
}

// skippedTooMany refuses a file of which more is bad than the feed allows.
func (m *merger) skippedTooMany() {
	if m.bad != nil || m.skipped == 0 || float64(m.skipped) <= m.feed.SkipShare*float64(m.cells) {
		return
	}
	first := m.faults[0]
	first.reason = fmt.Sprintf("%d of %d rows are bad, more than the share of %g that may be skipped; the first: %s",
		m.skipped, m.cells, m.feed.SkipShare, first.reason)
	m.bad = &first
}

// notes tells what was left out.
func (m *merger) notes(name string) []string {
	var notes []string
	for _, f := range m.faults {
		b := watcher.BadFile{File: watcher.File{Name: name}}
		m.place(&b, &f)
		notes = append(notes, "skipped "+b.Error())
	}
	if more := m.skipped - len(m.faults); more > 0 {
		notes = append(notes, fmt.Sprintf("skipped %d more", more))
	}
	if m.grid != nil {
		notes = append(notes, m.grid.Notes()...)
	}
	return notes
}
