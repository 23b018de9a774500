package feed

import (
	"encoding/binary"
	"fmt"
	"hash/maphash"
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

	date      rules.Date
	dates     []knownDate    // in the order of their first appearance
	dateIndex map[string]int // where each is among them, by its text
	dateNow   int            // the last row's

	next   uint32 // one after the series of the last row
	ended  int64  // where the last chunk ended in the file
	guess  int64  // the series of the chunk's first row, if the rows between the chunks went on in order; -1 for none
	hint   uint32 // 1 when rows repeat the series of the row before, else 0
	recent *[recentNames]uint32
	seed   maphash.Seed

	name []byte // the row's series when it has no number yet
	id   uint32
	v    int64
	dec  uint8
	none bool // the value is a missing token
	rules.Terms
	bad fault
}

func (p *plan) parser(names *watcher.Names) *parser {
	return &parser{plan: p, names: names, dateIndex: map[string]int{}, recent: new([recentNames]uint32), seed: maphash.MakeSeed()}
}

// parse works through a chunk.
func (p *parser) parse(c *chunk) {
	p.out, p.name = c, nil
	p.cursor = cursor{text: c.text, sep: p.comma, flat: p.asGrid, arena: c.arena}
	p.guess = p.guessFirst(c)
	for p.at < len(p.text) {
		if b := p.text[p.at]; b <= ' ' && p.blank() {
			continue
		}
		if p.text[p.at] == '#' && p.trailer() {
			continue
		}
		if len(c.trailers) > 0 {
			p.note(p.afterTrailer())
			break
		}
		c.records++
		from, line, start := p.at, p.line, p.lineStart
		if ok := p.row(); ok && p.at-from <= p.limits.LineBytes {
			continue
		}
		if !p.failed(from, line, start) {
			break
		}
	}
	c.arena, c.lines, p.ended = p.arena, p.line, c.at+int64(len(c.text))
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
	return fault{line: p.line, column: p.column(p.at, p.lineStart), reason: problem, fatal: true}
}

// fail sets the fault of a cell that began at a byte of the current line.
func (p *parser) fail(at int, line uint32, start int, cell []byte, reason string) bool {
	p.bad = fault{line: line, column: p.column(at, start), cell: string(cell), reason: reason}
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
		p.bad = fault{line: line, column: p.column(at, start), cell: string(cell), reason: problem, fatal: true}
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

// takeValue reads a number of at most 18 digits without an exponent at once, everything else by take.
func (p *parser) takeValue() bool {
	text, i := p.text, p.at
	neg := text[i] == '-'
	if neg {
		i++
	}
	from := i
	m, i := digitRun(text, i, 0)
	whole, frac := i-from, 0
	if text[i] == p.mark {
		from = i + 1
		if m, i = digitRun(text, from, m); i == from {
			return p.take((*parser).judgeValue)
		}
		frac = i - from
	}
	dec := frac + p.shift
	if whole == 0 || whole+frac > 18 || dec > p.places || m > p.most[dec] || !p.ends(text[i]) || p.special(m, neg, i) {
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

// digitRun reads on from a number through the digits at i and says where they end. Beyond 18 digits the number is nonsense.
func digitRun(text []byte, i int, m uint64) (uint64, int) {
	if i+8 <= len(text) {
		if x := binary.LittleEndian.Uint64(text[i:]); eightDigits(x) {
			m = m*1e8 + eightValue(x)
			i += 8
		}
	}
	for d := text[i] - '0'; d <= 9; d = text[i] - '0' {
		m = m*10 + uint64(d)
		i++
	}
	return m, i
}

// eightDigits says whether all eight bytes are ASCII digits: the high half of each is 3, also after adding 6.
func eightDigits(x uint64) bool {
	return x&0xF0F0F0F0F0F0F0F0|(x+0x0606060606060606)&0xF0F0F0F0F0F0F0F0>>4 == 0x3333333333333333
}

// eightValue joins neighbours to pairs, pairs to fours, fours to the number; the first digit is the lowest byte.
func eightValue(x uint64) uint64 {
	x = x & 0x0F0F0F0F0F0F0F0F * (10<<8 + 1) >> 8
	x = x & 0x00FF00FF00FF00FF * (100<<16 + 1) >> 16
	return x & 0x0000FFFF0000FFFF * (10000<<32 + 1) >> 32
}

// special says whether a well-formed number needs a second look.
func (p *parser) special(m uint64, neg bool, end int) bool {
	return p.price && (neg || m == 0) || len(p.digits) > 0 && p.isDigits(p.text[p.at:end])
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
