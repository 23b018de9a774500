package feed

import "strconv"

// longRow reads one observation.
func (p *parser) longRow() bool {
	line := p.line
	for i, r := range p.roles {
		if i > 0 && !p.separator() {
			p.fail(p.at, p.line, p.lineStart, nil, carriageReturn)
			return p.lost()
		}
		ok := true
		switch r {
		case roleDate:
			ok = p.takeDate()
		case roleSeries:
			ok = p.takeSeries()
		case roleValue:
			ok = p.takeValue()
		default:
			ok = p.takeOther(r)
		}
		if !ok {
			return p.lost()
		}
	}
	if !p.endOfLine() {
		p.fail(p.at, p.line, p.lineStart, nil, carriageReturn)
		return p.lost()
	}
	p.observe(line)
	return true
}

// lost counts a row that gives no observation because it is bad.
func (p *parser) lost() bool {
	p.out.cells++
	p.out.skipped++
	return false
}

func (p *parser) observe(line uint32) {
	p.out.cells++
	switch {
	case p.none:
		p.out.missing++
	case p.name != nil:
		p.out.emitFresh(p.date, p.name, line, p.v, p.dec)
	default:
		p.out.emit(p.date, p.id, line, p.v, p.dec)
	}
	if (p.Days > 1 || p.Estimate) && !p.none {
		p.out.noteTerms(p.date, p.id, p.name != nil, p.Terms)
	}
}

// takeOther checks a cell that carries no observation.
func (p *parser) takeOther(r role) bool {
	switch r {
	case roleStatus:
		return p.take((*parser).judgeStatus)
	case roleDays:
		return p.take((*parser).judgeDays)
	}
	i := p.at
	for b := p.text[i]; b > ' ' && b < 0x7f && b != '"' && b != p.sep; b = p.text[i] {
		i++
	}
	if p.ends(p.text[i]) {
		p.at = i
		return true
	}
	return p.take((*parser).judgeText)
}

func (p *parser) judgeText(cell []byte) string { return p.badText(cell) }

func (p *parser) judgeStatus(cell []byte) string {
	s := string(cell)
	if s != "estimate" && s != "final" {
		return "the status is neither estimate nor final"
	}
	p.Estimate = s == "estimate"
	return ""
}

func (p *parser) judgeDays(cell []byte) string {
	n, err := strconv.Atoi(string(cell))
	if err != nil || n < 1 || n > mostDays || digitsAt(cell) != len(cell) {
		return "the number of days is not a whole number from 1 to " + strconv.Itoa(mostDays)
	}
	p.Days = n
	return ""
}

// mostDays is the longest stretch that one return may cover: a year of calendar days.
const mostDays = 366
