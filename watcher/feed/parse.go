package feed

import (
	"fmt"
	"math"

	"strayd/rules"
	"strayd/watcher"
)

// parser turns chunks into runs. One a worker: what it remembers of earlier rows only saves time.
type parser struct {
	*plan
	cursor
	names *watcher.Names
	out   *chunk

	dateText []byte // the last good date as it was written
	date     rules.Date
	next     uint32 // one after the series of the last row
	hint     uint32 // 1 when rows repeat the series of the row before, else 0
	name     []byte // the row's series when it has no number yet
	id       uint32
	v        int64
	dec      uint8
	none     bool // the value is a missing token
	bad      fault
}

// parse works through a chunk.
func (p *parser) parse(c *chunk) {
	p.out = c
	p.cursor = cursor{text: c.text, sep: p.comma, arena: c.arena}
	for p.at < len(p.text) {
		if b := p.text[p.at]; b <= ' ' && p.blank() {
			continue
		}
		from, line, start := p.at, p.line, p.lineStart
		if ok := p.row(); ok && p.at-from <= p.limits.LineBytes {
			continue
		}
		if !p.failed(from, line, start) {
			break
		}
	}
	c.arena, c.lines = p.arena, p.line
}

func (p *parser) row() bool {
	if p.wide {
		return p.wideRow()
	}
	return p.longRow()
}

// failed records the fault of the row that began at from, and steps over the row. It says whether to go on.
func (p *parser) failed(from int, line uint32, start int) bool {
	bad, reached := p.bad, p.at
	p.at, p.line, p.lineStart = from, line, start
	cells, problem := p.record()
	switch {
	case max(p.at, reached)-from > p.limits.LineBytes:
		bad = fault{line: line, reason: tooLong(p.limits.LineBytes), fatal: true}
	case problem != "" && !bad.fatal:
		bad = p.quotingFault(problem)
	case !bad.fatal && cells != p.width:
		bad = fault{line: line, reason: fmt.Sprintf("the line has %d cells, the header has %d", cells, p.width)}
	}
	p.bad = fault{}
	return p.note(bad)
}

// note keeps a fault and says whether the chunk goes on after it.
func (p *parser) note(bad fault) bool {
	if bad.fatal || p.feed.SkipShare == 0 {
		p.out.bad = append(p.out.bad, bad)
		p.out.stop = true
		return false
	}
	if len(p.out.bad) < mostFaults {
		p.out.bad = append(p.out.bad, bad)
	}
	return true
}

func (p *parser) quotingFault(problem string) fault {
	return fault{line: p.line, column: p.at - p.lineStart + 1, reason: problem, fatal: true}
}

// fail sets the fault of a cell that began at a byte of the current line.
func (p *parser) fail(at int, line uint32, start int, cell []byte, reason string) bool {
	p.bad = fault{line: line, column: at - start + 1, cell: string(cell), reason: reason}
	return false
}

// take reads one cell the thorough way and checks it with judge, which gives the reason to refuse it.
func (p *parser) take(judge func(*parser, []byte) string) bool {
	at, line, start := p.at, p.line, p.lineStart
	for p.space(p.text[at]) {
		at++
	}
	cell, problem := p.cell()
	if problem != "" {
		p.bad = fault{line: line, column: at - start + 1, cell: string(cell), reason: problem, fatal: true}
		return false
	}
	if reason := judge(p, cell); reason != "" {
		if text := p.badText(cell); text != "" {
			reason = text
		}
		return p.fail(at, line, start, cell, reason)
	}
	return true
}

// takeDate reads a date; rows come in runs of one date, so its text is compared with the last one first.
func (p *parser) takeDate() bool {
	end := p.at + len(p.dateText)
	if end < len(p.text) && p.ends(p.text[end]) && string(p.text[p.at:end]) == string(p.dateText) && end > p.at {
		p.at = end
		return true
	}
	return p.take((*parser).judgeDate)
}

func (p *parser) judgeDate(cell []byte) string {
	d, reason := p.style.date(cell)
	if reason == "" {
		reason = inBounds(d, p.newest)
	}
	if reason != "" {
		return reason
	}
	p.date, p.dateText = d, append(p.dateText[:0], cell...)
	return ""
}

// takeValue reads a number of at most 18 digits without an exponent at once, everything else by take.
func (p *parser) takeValue() bool {
	text, i := p.text, p.at
	neg := text[i] == '-'
	if neg {
		i++
	}
	var m uint64
	from := i
	for d := text[i] - '0'; d <= 9; d = text[i] - '0' {
		m = m*10 + uint64(d)
		i++
	}
	whole, frac := i-from, 0
	if text[i] == p.mark {
		i++
		from = i
		for d := text[i] - '0'; d <= 9; d = text[i] - '0' {
			m = m*10 + uint64(d)
			i++
		}
		if frac = i - from; frac == 0 {
			return p.take((*parser).judgeValue)
		}
	}
	dec := frac + p.shift
	if whole == 0 || whole+frac > 18 || dec > p.places || m > p.most[dec] || !p.ends(text[i]) || p.special(m, neg, text[p.at:i]) {
		return p.take((*parser).judgeValue)
	}
	p.at, p.none = i, false
	p.v, p.dec = int64(m), uint8(dec)
	if m > math.MaxInt32 {
		p.shorten()
	}
	if neg {
		p.v = -p.v
	}
	return true
}

// special says whether a well-formed number needs a second look.
func (p *parser) special(m uint64, neg bool, cell []byte) bool {
	return p.price && (neg || m == 0) || len(p.digits) > 0 && p.isDigits(cell)
}

// shorten takes trailing zeros off a long mantissa, so that more columns fit 32 bits.
func (p *parser) shorten() {
	for p.v%10 == 0 && p.dec > 0 {
		p.v /= 10
		p.dec--
	}
}

func (p *parser) judgeValue(cell []byte) string {
	if p.none = p.isMissing(cell); p.none {
		return ""
	}
	v, dec, why := p.exact(cell)
	p.v, p.dec = v, dec
	if why != numberGood {
		return p.whyNot(cell, why)
	}
	return ""
}
