package watcher

import (
	"fmt"
	"math/bits"
	"slices"

	"strayd/rules"
)

// returnsOf turns a sheet of prices into the returns that it makes or changes, and the prices to be stored. A price enters two
// returns: its own date's and that of the next date with a price. A return covers the business days from one price to the next, unless
// the sheet says otherwise of the row that makes it.
//
//	return = price / previous price - 1, exact ratio rounded once, half to even, to a unit of 1e-15
func returnsOf(v View, j *judging, sheet *Sheet) (returns, prices []*Column, terms []CellTerms, err error) {
	held, err := v.Dates(Prices)
	if err != nil {
		return nil, nil, nil, err
	}
	byBlock := map[uint32][]*Column{}
	for _, c := range sheet.Columns {
		byBlock[c.Block] = append(byBlock[c.Block], c)
	}
	for number, columns := range byBlock {
		b := &priceBlock{v: v, j: j, sheet: sheet, number: number, held: held}
		if err := b.run(columns); err != nil {
			return nil, nil, nil, err
		}
		returns, prices, terms = append(returns, b.returns...), append(prices, b.prices...), append(terms, b.terms...)
	}
	byDate := func(x, y *Column) int {
		if x.Date != y.Date {
			return int(x.Date) - int(y.Date)
		}
		return int(x.Block) - int(y.Block)
	}
	slices.SortFunc(returns, byDate)
	slices.SortFunc(prices, byDate)
	return returns, prices, SortTerms(terms), nil
}

// priceBlock goes through the dates of one block, carrying the newest price of each series.
type priceBlock struct {
	v      View
	j      *judging
	sheet  *Sheet
	number uint32
	held   []rules.Date

	last    []int64      // newest price so far, Missing64 when none
	on      []rules.Date // its date
	changed []uint32     // the line on which the file changed that price, 0 when it did not
	returns []*Column
	prices  []*Column
	terms   []CellTerms
	days    []*rules.Calendar // of each series; nil until one is needed
	pair    pair
}

func (b *priceBlock) run(columns []*Column) error {
	b.last, b.on, b.changed = make([]int64, BlockSize), make([]rules.Date, BlockSize), make([]uint32, BlockSize)
	fillMissing(b.last)
	if err := b.before(columns[0].Date); err != nil {
		return err
	}
	from, _ := slices.BinarySearch(b.held, columns[0].Date)
	replay := b.held[from:]
	for len(columns) > 0 || len(replay) > 0 {
		var c *Column
		var date rules.Date
		if len(columns) > 0 && (len(replay) == 0 || columns[0].Date <= replay[0]) {
			c, date, columns = columns[0], columns[0].Date, columns[1:]
		} else {
			date = replay[0]
		}
		if len(replay) > 0 && replay[0] == date {
			replay = replay[1:]
		}
		if err := b.date(date, c); err != nil {
			return err
		}
	}
	return nil
}

// before finds the newest price of each series ahead of a date.
func (b *priceBlock) before(date rules.Date) error {
	if int(b.number)*BlockSize >= b.j.heldNames {
		return nil
	}
	n, _ := slices.BinarySearch(b.held, date)
	open := min(BlockSize, b.j.heldNames-int(b.number)*BlockSize)
	vals := make([]int64, BlockSize)
	for i := n - 1; i >= 0 && open > 0; i-- {
		ok, err := b.v.Fill(Prices, b.held[i], b.number, 0, vals)
		if err != nil {
			return err
		}
		for k := range vals {
			if ok && vals[k] != Missing64 && b.last[k] == Missing64 {
				b.last[k], b.on[k] = vals[k], b.held[i]
				open--
			}
		}
	}
	return nil
}

// date takes the prices of one date: those held, overlaid by the file's.
func (b *priceBlock) date(date rules.Date, c *Column) error {
	old, err := heldColumn(b.v, b.j, Prices, b.held, &Column{Date: date, Block: b.number})
	if err != nil {
		return err
	}
	now := make([]int64, BlockSize)
	fillMissing(now)
	if old != nil {
		copy(now, old)
	}
	var col *Column
	if c != nil {
		overlay(now, c, rules.PricePlaces)
		if col = c; old != nil {
			col = differing(c, old, Prices, nil)
		}
	}
	if col != nil {
		b.prices = append(b.prices, col)
	}
	var lines []uint32
	if col != nil {
		lines = col.AllLines()
	}
	cells := NewCells(date, b.number, rules.Places)
	for i, price := range now {
		if price == Missing64 {
			continue
		}
		var line uint32
		if i < len(lines) {
			line = lines[i]
		}
		if err := b.cell(cells, i, price, line); err != nil {
			return err
		}
	}
	if r := cells.Column(); r != nil {
		b.returns = append(b.returns, r)
	}
	return nil
}

// overlay puts the present cells of a column over a row.
func overlay(now []int64, c *Column, places int) {
	vals := make([]int64, c.Len())
	c.Fill(vals, 0, places)
	for i, x := range vals {
		if x != Missing64 {
			now[i] = x
		}
	}
}

// cell makes the return of one price when this price or the one before it is new or changed. line is 0 when this one is not.
func (b *priceBlock) cell(cells *Cells, i int, price int64, line uint32) error {
	if prev := b.last[i]; prev != Missing64 && (line > 0 || b.changed[i] > 0) {
		r, ok := Ratio(price, prev)
		if !ok {
			return &BadFile{File: b.sheet.File, Line: int(max(line, b.changed[i])), Cell: rules.Price(price).String(), Date: cells.col.Date,
				Reason: fmt.Sprintf("return from the price before, %s, is beyond +-9,223", rules.Price(prev))}
		}
		cells.Set(i, r, max(line, b.changed[i]))
		b.termsOf(cells.col.Date, i, line > 0)
	}
	b.last[i], b.on[i], b.changed[i] = price, cells.col.Date, line
	return nil
}

// Ratio is price/before - 1 in units of 1e-15, rounded half to even. Both are above 0. ok is false when it does not fit.
func Ratio(price, before int64) (int64, bool) {
	diff := price - before
	neg := diff < 0
	hi, lo := bits.Mul64(uint64(max(diff, -diff)), uint64(rules.One))
	if hi >= uint64(before) {
		return 0, false
	}
	q, r := bits.Div64(hi, lo, uint64(before))
	if twice := 2 * r; twice > uint64(before) || twice == uint64(before) && q&1 == 1 {
		q++
	}
	if q > 1<<63-1 {
		return 0, false
	}
	if neg {
		return -int64(q), true
	}
	return int64(q), true
}
