package feed

import (
	"math"

	"strayd/rules"
	"strayd/watcher"
)

// open is a column that still takes values.
type open struct {
	watcher.Column
	count uint32 // values held
	last  uint32 // line of the newest
	wide  bool   // V64 is used, at the full places
}

// builder gathers the values of one file in columns, whatever the order in which they come.
type builder struct {
	places   int
	first    rules.Date       // of spans[0]
	spans    []*[span][]*open // by date, then block
	room     []int            // by block: the length of its longest column
	bytes    int64
	rows     int
	repeated int
}

// span is how many dates lie together.
const span = 512

// clash is a second, different value of a series and date.
type clash struct {
	date    rules.Date
	id      uint32
	oldLine uint32
	line    uint32
}

func newBuilder(places int, newest rules.Date) *builder {
	first, _ := rules.DateOf(firstYear, 1, 1)
	return &builder{places: places, first: first, spans: make([]*[span][]*open, max(0, int(newest-first)/span+1))}
}

// add takes the values of a run, of which the first stands on a line of the file.
func (b *builder) add(r run, vals []int64, line, stride uint32) *clash {
	for len(vals) > 0 {
		off := int(r.id % watcher.BlockSize)
		n := min(len(vals), watcher.BlockSize-off)
		o := b.column(r.date, r.id/watcher.BlockSize)
		if bad := b.put(o, off, vals[:n], r.dec, line, stride); bad != nil {
			return bad
		}
		vals, r.id, line = vals[n:], r.id+uint32(n), line+uint32(n)*stride
	}
	return nil
}

// column finds or makes the column of a date and block.
func (b *builder) column(d rules.Date, block uint32) *open {
	i := int(d - b.first)
	dates := b.spans[i/span]
	if dates == nil {
		dates = new([span][]*open)
		b.spans[i/span] = dates
	}
	day := &dates[i%span]
	if int(block) >= len(*day) {
		grown := make([]*open, max(int(block)+1, len(b.room)))
		copy(grown, *day)
		*day = grown
		b.bytes += 8 * int64(len(grown))
	}
	o := (*day)[block]
	if o == nil {
		o = &open{Column: watcher.Column{Date: d, Block: block}}
		(*day)[block] = o
		b.bytes += 160
	}
	return o
}

// put stores values at consecutive offsets.
func (b *builder) put(o *open, off int, vals []int64, dec uint8, line, stride uint32) *clash {
	if have := o.Len(); off < have {
		return b.putWithin(o, off, vals, dec, line, stride)
	}
	b.extend(o, off+len(vals))
	if o.count == 0 {
		o.Decimals = dec
	}
	done := 0
	if !o.wide && dec == o.Decimals {
		done = copy32(o.V32[off:], vals)
	}
	for i, v := range vals[done:] {
		b.set(o, off+done+i, v, dec)
	}
	b.rows += len(vals)
	had := cap(o.Lines.At)
	o.noteRun(off, len(vals), line, stride)
	b.bytes += 4 * int64(cap(o.Lines.At)-had)
	return nil
}

// copy32 copies as many values as fit 32 bits.
func copy32(dst []int32, vals []int64) int {
	dst = dst[:len(vals)]
	for i, v := range vals {
		if int64(int32(v)) != v || v == watcher.Missing32 {
			return i
		}
		dst[i] = int32(v)
	}
	return len(vals)
}

// putWithin stores values one by one where there may be some already.
func (b *builder) putWithin(o *open, off int, vals []int64, dec uint8, line, stride uint32) *clash {
	for i, v := range vals {
		have := o.Len()
		if off+i >= have {
			return b.put(o, off+i, vals[i:], dec, line, stride)
		}
		if old, ok := b.held(o, off+i); !ok {
			had := cap(o.Lines.At)
			o.note(off+i, line, false)
			b.bytes += 4 * int64(cap(o.Lines.At)-had)
			b.set(o, off+i, v, dec)
			b.rows++
		} else if old == v*int64(rules.Pow10(b.places-int(dec))) {
			b.repeated++
		} else {
			return &clash{date: o.Date, id: o.Block*watcher.BlockSize + uint32(off+i), oldLine: o.Line(off + i), line: line}
		}
		line += stride
	}
	return nil
}

// held is the value at an offset, at the full places.
func (b *builder) held(o *open, off int) (int64, bool) {
	if o.wide {
		return o.V64[off], o.V64[off] != watcher.Missing64
	}
	if o.V32[off] == watcher.Missing32 {
		return 0, false
	}
	return int64(o.V32[off]) * int64(rules.Pow10(b.places-int(o.Decimals))), true
}

// set stores one value, changing the column's decimals or width where it must.
func (b *builder) set(o *open, off int, v int64, dec uint8) {
	if !o.wide {
		if o.narrow(off, v, dec) {
			return
		}
		b.widen(o)
	}
	o.V64[off] = v * int64(rules.Pow10(b.places-int(dec)))
}

// narrow stores a value in 32 bits if it fits.
func (o *open) narrow(off int, v int64, dec uint8) bool {
	if dec > o.Decimals && !o.refine(dec) {
		return false
	}
	w, ok := rescale(v, dec, o.Decimals)
	if !ok || w != int64(int32(w)) || w == watcher.Missing32 {
		return false
	}
	o.V32[off] = int32(w)
	return true
}

// refine gives the column more decimals if all its values then still fit.
func (o *open) refine(dec uint8) bool {
	mul := rules.Pow10(int(dec - o.Decimals))
	most := int32(0)
	if mul <= math.MaxInt32 {
		most = int32(math.MaxInt32 / mul)
	}
	for _, v := range o.V32 {
		if v != watcher.Missing32 && (v > most || v < -most) {
			return false
		}
	}
	for i, v := range o.V32 {
		if v != watcher.Missing32 && v != 0 {
			o.V32[i] = v * int32(mul)
		}
	}
	o.Decimals = dec
	return true
}

// widen turns the column to 64 bits at the full places.
func (b *builder) widen(o *open) {
	was := o.V32
	o.V64 = make([]int64, len(was), cap(was))
	b.bytes += 8 * int64(cap(was))
	for i := range was {
		v, ok := b.held(o, i)
		if !ok {
			v = watcher.Missing64
		}
		o.V64[i] = v
	}
	o.V32, o.wide, o.Decimals = nil, true, uint8(b.places)
}

// extend makes the column at least n long.
func (b *builder) extend(o *open, n int) {
	block := int(o.Block)
	for block >= len(b.room) {
		b.room = append(b.room, 0)
	}
	b.room[block] = max(b.room[block], n)
	was := cap(o.V32) + cap(o.V64)
	if o.wide {
		o.V64 = stretch(o.V64, n, b.room[block], watcher.Missing64)
		b.bytes += 8 * int64(cap(o.V64)-was)
	} else {
		o.V32 = stretch(o.V32, n, b.room[block], watcher.Missing32)
		b.bytes += 4 * int64(cap(o.V32)-was)
	}
	if o.Lines.At != nil {
		o.Lines.At = stretch(o.Lines.At, n, b.room[block], 0)
	}
}

// stretch lengthens s to n with fill. Its room is what the longest column of the block needs; past that it grows fourfold.
func stretch[T int32 | int64 | uint32](s []T, n, room int, fill T) []T {
	have := len(s)
	if n > cap(s) {
		if have > 0 {
			room = max(room, 4*cap(s), 64)
		}
		grown := make([]T, have, min(max(room, n), watcher.BlockSize))
		copy(grown, s)
		s = grown
	}
	s = s[:n]
	for i := have; i < n; i++ {
		s[i] = fill
	}
	return s
}
