package feed

import (
	"bytes"
	"fmt"
	"math"
	"slices"

	"strayd/rules"
	"strayd/watcher"
)

// role is what a column of a long file holds.
type role uint8

const (
	roleOther role = iota
	roleDate
	roleSeries
	roleValue
	roleStatus
	roleDays
)

// plan is a feed's declaration made ready for the parser, then completed by the file's header.
type plan struct {
	amount
	feed    rules.Feed
	limits  Limits
	wide    bool
	comma   byte
	asGrid  bool // the cells come from a grid
	style   dateStyle
	newest  rules.Date
	missing [][]byte
	empty   bool       // the empty cell is a missing token
	digits  [][]byte   // the missing tokens that look like numbers
	most    [20]uint64 // most[d] is the greatest mantissa with d decimals

	width  int      // columns of the header
	roles  []role   // long: what each column is
	dateAt int      // wide: the column of the dates
	ids    []uint32 // wide: the series of each column
}

// newPlan takes a feed's declaration. An empty setting stands for the default of the configuration. The error is about the
// declaration, not about a file.
func newPlan(f rules.Feed, o Options) (*plan, error) {
	p := &plan{feed: f, limits: o.Limits, wide: f.Layout == rules.Wide, comma: f.Separator, newest: rules.DateFrom(o.Now) + 1}
	if p.comma == 0 {
		p.comma = ','
	}
	p.amount = amount{mark: f.Decimal, shift: f.Unit.Decimals(), places: rules.Places}
	if p.mark == 0 {
		p.mark = '.'
	}
	if f.Value == rules.OfPrice {
		p.amount = amount{mark: p.mark, places: rules.PricePlaces, price: true}
	}
	style := f.DateStyle
	if style == "" {
		style = "YYYY-MM-DD"
	}
	var err error
	if p.style, err = parseStyle(style); err != nil {
		return nil, fmt.Errorf("feed %s: %w", f.Name, err)
	}
	p.setMissing(f.Missing)
	p.setMost()
	return p, p.check()
}

func (p *plan) check() error {
	switch f := p.feed; {
	case f.Layout != "" && f.Layout != rules.Long && f.Layout != rules.Wide:
		return fmt.Errorf("feed %s: unknown layout %q", f.Name, f.Layout)
	case f.Columns.Date == "" || !p.wide && (f.Columns.Series == "" || f.Columns.Value == ""):
		return fmt.Errorf("feed %s: columns need the names of date, series and value (wide: of date)", f.Name)
	case p.comma == '"' || p.comma == '\n' || p.comma == '\r' || p.comma == ' ' || p.comma-'0' <= 9:
		return fmt.Errorf("feed %s: separator %q cannot part cells", f.Name, p.comma)
	}
	return nil
}

func (p *plan) setMissing(tokens []string) {
	for _, t := range tokens {
		m := bytes.TrimSpace([]byte(t))
		p.missing = append(p.missing, m)
		p.empty = p.empty || len(m) == 0
		if _, _, why := p.exact(m); why != numberBad {
			p.digits = append(p.digits, m)
		}
	}
}

// setMost makes the greatest mantissas: most[d] x 10^(places-d) still fits 63 bits. A separator that is also the decimal mark
// leaves no number for the fast way.
func (p *plan) setMost() {
	if p.comma == p.mark {
		return
	}
	for d := 0; d <= p.places; d++ {
		p.most[d] = math.MaxInt64 / rules.Pow10(p.places-d)
	}
}

func (p *plan) isMissing(cell []byte) bool {
	return slices.ContainsFunc(p.missing, func(m []byte) bool { return bytes.Equal(m, cell) })
}

func (p *plan) isDigits(cell []byte) bool {
	return slices.ContainsFunc(p.digits, func(m []byte) bool { return bytes.Equal(m, cell) })
}

// what says which stored quantity the file holds.
func (p *plan) what() watcher.What {
	if p.price {
		return watcher.Prices
	}
	return watcher.Returns
}

// valueAt is the column of a series' value.
func (p *plan) valueAt(id uint32) int {
	if p.wide {
		return slices.Index(p.ids, id)
	}
	return slices.Index(p.roles, roleValue)
}
