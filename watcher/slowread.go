package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// read fills in one date of a block: what windows take of the returns, and the residuals. A value that somebody decided to be an error, or
// that looks more like one than anything else, is missing in both.
func (s *slowScan) read(n int, block uint32) error {
	date, returns, residuals := s.dates[n], s.returns[n*BlockSize:(n+1)*BlockSize], s.residuals[n*BlockSize:(n+1)*BlockSize]
	fillMissing(returns)
	fillMissing(residuals)
	if s.raw != nil {
		fillMissing(s.raw[n*BlockSize : (n+1)*BlockSize])
	}
	ok, err := s.view.Fill(Returns, date, block, 0, returns)
	if err != nil || !ok {
		return err
	}
	if err := s.j.withoutSpans(s.view, date, block, 0, returns); err != nil {
		return err
	}
	if s.j.residuals != 0 {
		if err := s.view.Patch(s.j.residuals, date, block, 0, residuals); err != nil {
			return err
		}
	}
	return s.used(n, block, returns, residuals)
}

// used puts used values in the place of returns, and takes out what the pool leaves out.
func (s *slowScan) used(n int, block uint32, returns, residuals []int64) error {
	raw, date := slices.Clone(returns), s.dates[n]
	for n, g := range s.j.gauges {
		if g.Range.Limit == nil && g.Range.Of == rules.Return && s.j.ids[n] != 0 {
			if err := s.view.Patch(s.j.ids[n], date, block, 0, returns); err != nil {
				return err
			}
		}
	}
	clear(s.uses)
	if s.j.concluded != 0 {
		if err := s.view.Patch(s.j.concluded, date, block, 0, s.uses); err != nil {
			return err
		}
	}
	for i := range returns {
		switch {
		case returns[i] == Missing64 || s.uses[i] == int64(causes.Out):
			returns[i], raw[i] = Missing64, Missing64
		case residuals[i] != Missing64: // a residual belongs to the return as it came
			returns[i] = raw[i]
		}
	}
	if s.raw != nil {
		copy(s.raw[n*BlockSize:], raw)
	}
	return nil
}

// past gathers a series' observations, and says its newest date. It goes by residuals where the newest value has one: then only the dates
// that have one count.
// What it gives is valid until it is called again.
func (s *slowScan) past(at int) (p *rules.SlowPast, newest rules.Date) {
	p, newest = &s.seen, rules.NoDate
	p.Dates, p.Returns = p.Dates[:0], p.Returns[:0]
	last := len(s.dates) - 1
	for ; last >= 0 && s.returns[last*BlockSize+at] == Missing64; last-- {
	}
	if last < 0 {
		return p, newest
	}
	newest = s.dates[last]
	referenced := s.residuals[last*BlockSize+at] != Missing64
	if p.Residuals = nil; referenced {
		p.Residuals = s.left[:0]
	}
	for n, date := range s.dates[:last+1] {
		x, e := s.returns[n*BlockSize+at], s.residuals[n*BlockSize+at]
		if x == Missing64 || referenced && e == Missing64 {
			continue
		}
		p.Dates, p.Returns = append(p.Dates, date), append(p.Returns, rules.Units(x).Float())
		if referenced {
			p.Residuals = append(p.Residuals, rules.Units(e).Float())
		}
	}
	if referenced {
		s.left = p.Residuals
	}
	return p, newest
}
