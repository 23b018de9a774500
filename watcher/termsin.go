package watcher

import "strayd/rules"

// arriving compares the terms in a sheet with those held.
type arriving struct {
	v      View
	j      *judging
	list   []CellTerms
	days   bool // the sheet says of all its values how many days they cover
	status bool // and whether they are estimates
	used   []UsedColumn
}

// held are the codes held on the date of a column; nil where there are none.
func (a *arriving) held(c *Column, old []int64) ([]int64, error) {
	if a.j.terms == 0 || old == nil {
		return nil, nil
	}
	codes := make([]int64, BlockSize)
	return codes, termsHeld(a.v, a.j.terms, c.Date, c.Block, 0, codes)
}

// now are the terms of a value of the sheet. Where the sheet says nothing of them, an equal value keeps those that it had.
func (a *arriving) now(said, held rules.Terms, equal bool) rules.Terms {
	if equal && !a.days {
		said.Days = held.Days
	}
	if equal && !a.status {
		said.Estimate = held.Estimate
	}
	return said
}

// compare notes which terms of a column's values change, and marks those that are restated although their number stays: a value over
// other days is another value.
func (a *arriving) compare(c *Column, d *day, codes, old []int64) (again []bool) {
	u := UsedColumn{Range: a.j.terms, Date: c.Date, Block: c.Block}
	note := func(at int, code int64) {
		u.Offsets, u.Values = append(u.Offsets, uint16(at)), append(u.Values, code)
	}
	if codes == nil {
		for _, t := range d.terms {
			note(int(t.Series%BlockSize), t.Code())
		}
		a.keep(u)
		return nil
	}
	for at := range c.Len() {
		if !c.has(at) {
			continue
		}
		held, equal := rules.TermsOf(codes[at]), old[at] == c.units(at)
		now := a.now(d.termsOf(c.Block*BlockSize+uint32(at)), held, equal)
		if now.Code() != codes[at] {
			note(at, now.Code())
		}
		if equal && now.Span() != held.Span() {
			if again == nil {
				again = make([]bool, c.Len())
			}
			again[at] = true
		}
	}
	a.keep(u)
	return again
}

func (a *arriving) keep(u UsedColumn) {
	if len(u.Offsets) > 0 {
		a.used = append(a.used, u)
	}
}
