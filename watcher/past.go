package watcher

import (
	"context"
	"slices"

	"strayd/rules"
)

// Past is everything that a ledger holds, in memory, to be judged again under any settings: the newest version of every value, and what
// persons decided of these. One back-run at a time.
type Past struct {
	Dates  []rules.Date // on which something is held, ascending
	Series int
	Values int
	Flags  []rules.Flag // that were raised, by ref, as they stand

	names    *Names
	columns  [][]*Column // by block, then date
	terms    []CellTerms
	decided  map[rules.Date][]decidedValue // by series
	recorded *rules.Settings               // newest in the ledger
	weighed  weighedOnce
}

// decidedValue is what a person decided of a value as it stands.
type decidedValue struct {
	series uint32
	act    *rules.Act
}

// ReadPast reads all that a view holds.
func ReadPast(ctx context.Context, v View, progress Progress) (*Past, error) {
	dates, err := v.Dates(Returns)
	if err != nil {
		return nil, err
	}
	return readPast(ctx, v, dates, progress)
}

// readPast reads what a view holds on some dates, ascending.
func readPast(ctx context.Context, v View, dates []rules.Date, progress Progress) (*Past, error) {
	p := &Past{Dates: dates, decided: map[rules.Date][]decidedValue{}}
	var err error
	if p.names, err = v.Names(); err != nil {
		return nil, err
	}
	if _, p.recorded, err = lastSettings(v); err != nil {
		return nil, err
	}
	p.Series = p.names.Len()
	blocks := allBlocks(p.Series, rules.NoDate)
	p.columns = make([][]*Column, len(blocks))
	terms, err := NewTermsReader(v)
	if err != nil {
		return nil, err
	}
	r := &pastReading{p: p, v: v, terms: terms, row: make([]int64, BlockSize)}
	for n, date := range p.Dates {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		for _, b := range blocks {
			if err := r.read(date, b); err != nil {
				return nil, err
			}
		}
		if progress != nil {
			progress(int64(n+1), int64(len(p.Dates)))
		}
	}
	return p, r.readFlags()
}

// pastReading is one past on its way out of a view.
type pastReading struct {
	p      *Past
	v      View
	terms  *TermsReader
	row    []int64
	places int // decimals that did for the column before
}

func (r *pastReading) read(date rules.Date, b block) error {
	row := r.row[:b.series]
	fillMissing(row)
	if ok, err := r.v.Fill(Returns, date, b.number, 0, row); err != nil || !ok {
		return err
	}
	held := count(row)
	if held == 0 {
		return nil
	}
	r.p.Values += held
	r.p.columns[b.number] = append(r.p.columns[b.number], r.column(date, b.number, row))
	return r.readTerms(date, b, row)
}

// column packs the values of a date and block.
func (r *pastReading) column(date rules.Date, block uint32, row []int64) *Column {
	if narrow := narrowed(row, r.places); narrow != nil {
		return &Column{Date: date, Block: block, Decimals: uint8(r.places), V32: narrow}
	}
	build := NewCells(date, block, rules.Places)
	for i, v := range row {
		if v != Missing64 {
			build.Set(i, v, 0)
		}
	}
	c := build.Column()
	r.places = int(c.Decimals)
	return c
}

// narrowed are returns as 32-bit integers of so many decimals; nil where one does not fit.
func narrowed(row []int64, places int) []int32 {
	step := int64(rules.Pow10(rules.Places - places))
	out := make([]int32, len(row))
	for i, v := range row {
		if v == Missing64 {
			out[i] = Missing32
			continue
		}
		w := v / step
		if w*step != v || int64(int32(w)) != w || int32(w) == Missing32 {
			return nil
		}
		out[i] = int32(w)
	}
	return out
}

func (r *pastReading) readTerms(date rules.Date, b block, row []int64) error {
	if r.terms.id == 0 {
		return nil
	}
	for i, v := range row {
		series := b.number*BlockSize + uint32(i)
		t, err := r.terms.At(date, series)
		if err != nil {
			return err
		}
		if v != Missing64 && t != (rules.Terms{}) {
			r.p.terms = append(r.p.terms, CellTerms{Date: date, Series: series, Terms: t})
		}
	}
	return nil
}

// readFlags reads the flags, and what was decided of values as they stand.
func (r *pastReading) readFlags() error {
	p := r.p
	err := r.v.Flags(true, func(f rules.Flag) bool {
		p.Flags = append(p.Flags, f)
		id, ok := p.names.Find([]byte(f.Series))
		if f.Decided != nil && ok && slices.Contains(rules.Concluded, f.Kind) && p.value(id, f.Date) == int64(f.Return) {
			list := p.decided[f.Date]
			if !slices.ContainsFunc(list, func(d decidedValue) bool { return d.series == id }) {
				p.decided[f.Date] = append(list, decidedValue{id, f.Decided})
			}
		}
		return true
	})
	for _, list := range p.decided {
		slices.SortFunc(list, func(a, b decidedValue) int { return int(a.series) - int(b.series) })
	}
	return err
}

// value is what is held of a series on a date, Missing64 for nothing.
func (p *Past) value(series uint32, date rules.Date) int64 {
	columns := p.columns[series/BlockSize]
	n, ok := slices.BinarySearchFunc(columns, date, func(c *Column, d rules.Date) int { return int(c.Date) - int(d) })
	if at := int(series % BlockSize); ok && at < columns[n].Len() && columns[n].has(at) {
		return columns[n].units(at)
	}
	return Missing64
}

// blocks are the past as what one file would change in an empty ledger.
func (p *Past) blocks() []block {
	out := allBlocks(p.Series, rules.NoDate)
	for n := range out {
		for _, c := range p.columns[n] {
			out[n].days = append(out[n].days, &day{date: c.Date, col: c, terms: termsIn(p.terms, c.Date, c.Block)})
		}
	}
	return slices.DeleteFunc(out, func(b block) bool { return len(b.days) == 0 })
}

// ValuesFrom counts the values of a date and those after it.
func (p *Past) ValuesFrom(date rules.Date) (n int) {
	for _, columns := range p.columns {
		for _, c := range columns {
			for i := range c.Len() {
				if c.Date >= date && c.has(i) {
					n++
				}
			}
		}
	}
	return n
}
