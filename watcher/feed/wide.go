package feed

// wideRow reads one date: a value for every series of the header.
func (p *parser) wideRow() bool {
	line, before := p.line, p.out.mark()
	if p.dateAt > 0 && !p.wideDate() {
		return p.lostLine(before)
	}
	for i, id := range p.ids {
		if i > 0 && !p.separator() {
			p.fail(p.at, p.line, p.lineStart, nil, carriageReturn)
			return p.lostLine(before)
		}
		if i == p.dateAt {
			if !p.takeDate() {
				return p.lostLine(before)
			}
			continue
		}
		p.out.cells++
		switch {
		case p.empty && p.ends(p.text[p.at]):
			p.out.missing++
		case !p.takeValue():
			if p.bad.fatal || p.feed.SkipShare == 0 {
				return p.lostLine(before)
			}
			p.out.skipped++
			p.note(p.bad)
		case p.none:
			p.out.missing++
		default:
			p.out.emit(p.date, id, line, p.v, p.dec)
		}
	}
	if !p.endOfLine() {
		p.fail(p.at, p.line, p.lineStart, nil, carriageReturn)
		return p.lostLine(before)
	}
	return true
}

// wideDate reads the date of a row whose first column is another, and goes back.
func (p *parser) wideDate() bool {
	was := p.cursor
	for range p.dateAt {
		at := p.at
		if cell, problem := p.cell(); problem != "" {
			p.bad = fault{line: p.line, column: p.column(at, p.lineStart), cell: string(cell), reason: problem, fatal: true}
			return false
		}
		if !p.separator() {
			return p.fail(p.at, p.line, p.lineStart, nil, carriageReturn)
		}
	}
	ok := p.takeDate()
	if ok {
		arena := p.arena
		p.cursor = was
		p.arena = arena
	}
	return ok
}

// lostLine takes back what a bad line gave, and counts all its cells as bad.
func (p *parser) lostLine(before mark) bool {
	p.out.back(before)
	p.out.cells += p.width - 1
	p.out.skipped += p.width - 1
	return false
}

// mark is a state of a chunk to go back to.
type mark struct {
	runs, vals, bad         int
	missing, cells, skipped int
	n                       uint32 // of the last run
}

func (c *chunk) mark() mark {
	m := mark{runs: len(c.runs), vals: len(c.vals), bad: len(c.bad), missing: c.missing, cells: c.cells, skipped: c.skipped}
	if m.runs > 0 {
		m.n = c.runs[m.runs-1].n
	}
	return m
}

func (c *chunk) back(m mark) {
	c.runs, c.vals, c.bad = c.runs[:m.runs], c.vals[:m.vals], c.bad[:m.bad]
	if m.runs > 0 {
		c.runs[m.runs-1].n = m.n
	}
	c.missing, c.cells, c.skipped = m.missing, m.cells, m.skipped
}
