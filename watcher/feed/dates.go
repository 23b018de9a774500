package feed

import (
	"slices"

	"strayd/rules"
)

// knownDate is a date as it was written, so that it need not be parsed again.
type knownDate struct {
	text string
	date rules.Date
}

// mostDates is how many spellings of dates a parser remembers.
const mostDates = 1 << 14

// takeDate reads a date. Rows come in runs of one date, or the same dates follow one another series after series: the text is
// compared with the last row's and with the date that came after it.
func (p *parser) takeDate() bool {
	for k := p.dateNow; k < min(p.dateNow+2, len(p.dates)); k++ {
		known := &p.dates[k]
		end := p.at + len(known.text)
		if end < len(p.text) && p.ends(p.text[end]) && string(p.text[p.at:end]) == known.text {
			p.at, p.date, p.dateNow = end, known.date, k
			return true
		}
	}
	return p.take((*parser).judgeDate)
}

func (p *parser) judgeDate(cell []byte) string {
	if k, ok := p.dateIndex[string(cell)]; ok {
		p.date, p.dateNow = p.dates[k].date, k
		return ""
	}
	d, reason := p.style.date(cell)
	if reason == "" {
		reason = inBounds(d, p.newest)
	}
	if reason != "" {
		return reason + p.exchanged(cell)
	}
	p.date = d
	if len(p.dates) < mostDates {
		p.dateNow = len(p.dates)
		p.dateIndex[string(cell)] = p.dateNow
		p.dates = append(p.dates, knownDate{string(cell), d})
	}
	return ""
}

// exchanged says which date a refused one would be with day and month the other way round, where that is one that a file could be for.
func (p *parser) exchanged(cell []byte) string {
	s := &p.style
	if s.excel || len(cell) != s.width || slices.ContainsFunc(s.tokens, func(t dateToken) bool { return t.kind == 'N' }) {
		return ""
	}
	year, month, day, ok := s.fields(cell)
	d, real := rules.DateOf(year, day, month)
	if !ok || !real || inBounds(d, p.newest) != "" || month == day {
		return ""
	}
	return "; with day and month exchanged it is " + d.Day() + ": does the feed's date style say how the provider writes dates?"
}
