package watcher

import (
	"slices"

	"strayd/rules"
)

// changes finds what a sheet changes: the days of each block with only their new and changed cells. It puts the columns to be
// stored into the batch.
func (p *Pass) changes(j *judging, sheet *Sheet, b *Batch) ([]block, error) {
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	columns, terms := sheet.Columns, &arriving{v: v, j: j, list: sheet.Terms, days: sheet.Days, status: sheet.Status}
	if sheet.What == Prices {
		if columns, b.Prices, terms.list, err = returnsOf(v, j, sheet); err != nil {
			return nil, err
		}
		terms.days = true
	}
	blocks := map[uint32]*block{}
	for _, c := range columns {
		d, err := changedDay(v, j, c, terms)
		if err != nil {
			return nil, err
		}
		if d == nil {
			continue
		}
		b.Returns = append(b.Returns, d.col)
		if blocks[c.Block] == nil {
			n := j.names.Len() - int(c.Block)*BlockSize
			blocks[c.Block] = &block{number: c.Block, series: min(BlockSize, n), since: rules.NoDate}
		}
		blocks[c.Block].days = append(blocks[c.Block].days, d)
	}
	b.Used = terms.used
	var out []block
	for _, bl := range blocks {
		out = append(out, *bl)
	}
	slices.SortFunc(out, func(x, y block) int { return int(x.number) - int(y.number) })
	return out, nil
}

// changedDay compares a column with what is held. It is nil when nothing changes.
func changedDay(v View, j *judging, c *Column, terms *arriving) (*day, error) {
	old, err := heldColumn(v, j, Returns, j.held, c)
	if err != nil {
		return nil, err
	}
	d := &day{date: c.Date, col: c, old: old, terms: termsIn(terms.list, c.Date, c.Block)}
	if old == nil && len(d.terms) == 0 {
		return d, nil
	}
	codes, err := terms.held(c, old)
	if err != nil {
		return nil, err
	}
	var again []bool
	if j.terms != 0 {
		again = terms.compare(c, d, codes, old)
	}
	if old == nil {
		return d, nil
	}
	if d.col = differing(c, old, Returns, again); d.col == nil {
		return nil, nil
	}
	return d, nil
}

// heldColumn is what is held on the date of a column, nil when nothing is.
func heldColumn(v View, j *judging, what What, held []rules.Date, c *Column) ([]int64, error) {
	if _, ok := slices.BinarySearch(held, c.Date); !ok || int(c.Block)*BlockSize >= j.heldNames {
		return nil, nil
	}
	old := make([]int64, BlockSize)
	ok, err := v.Fill(what, c.Date, c.Block, 0, old)
	if err != nil || !ok {
		return nil, err
	}
	return old, nil
}

// differing is a column of only the cells whose value is not the held one, or that are to be taken again; the column itself when that is
// all of them; nil when there is none.
func differing(c *Column, old []int64, what What, again []bool) *Column {
	now := make([]int64, c.Len())
	c.Fill(now, 0, what.Places())
	build, lines := NewCells(c.Date, c.Block, what.Places()), c.AllLines()
	same := false
	for i, x := range now {
		switch {
		case x == Missing64:
		case x == old[i] && (again == nil || !again[i]):
			same = true
		default:
			build.Set(i, x, lines[i])
		}
	}
	if !same {
		return c
	}
	return build.Column()
}

// Cells builds a column cell by cell, by ascending offset.
type Cells struct {
	col    Column
	places int
}

// NewCells begins a column of values at the given number of places.
func NewCells(date rules.Date, block uint32, places int) *Cells {
	return &Cells{Column{Date: date, Block: block, Decimals: uint8(places)}, places}
}

// Set puts a value with its source line at an offset beyond all those set before.
func (c *Cells) Set(offset int, value int64, line uint32) {
	for len(c.col.V64) < offset {
		c.col.V64 = append(c.col.V64, Missing64)
		c.col.Lines.At = append(c.col.Lines.At, 0)
	}
	c.col.V64 = append(c.col.V64, value)
	c.col.Lines.At = append(c.col.Lines.At, line)
}

// Column is the column, narrowed to 32-bit values where a power of ten allows; nil when nothing was set.
func (c *Cells) Column() *Column {
	if len(c.col.V64) == 0 {
		return nil
	}
	step := int64(1)
	for c.col.Decimals > 0 && c.divisible(step*10) {
		step *= 10
		c.col.Decimals--
	}
	narrow := make([]int32, len(c.col.V64))
	for i, v := range c.col.V64 {
		switch w := v / step; {
		case v == Missing64:
			narrow[i] = Missing32
		case int64(int32(w)) != w || int32(w) == Missing32:
			c.col.Decimals = uint8(c.places)
			return &c.col
		default:
			narrow[i] = int32(w)
		}
	}
	c.col.V32, c.col.V64 = narrow, nil
	return &c.col
}

func (c *Cells) divisible(step int64) bool {
	for _, v := range c.col.V64 {
		if v != Missing64 && v%step != 0 {
			return false
		}
	}
	return true
}
