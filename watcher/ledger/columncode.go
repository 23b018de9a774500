package ledger

import (
	"encoding/binary"
	"math/bits"
	"sort"

	"strayd/rules"
	"strayd/watcher"
)

// A column's value, little endian, after its seal:
//
//	shape u8, decimals u8, n u16, present u16, width u8, longs u8, first u32, stride u32, offsets, values, lines
//
// Dense: no offsets, n values. Sparse: n offsets of u16, ascending, then n values. Values are int32, or int64 in a wide
// column, or of three bytes in a short one, with a list of the few that need more behind them. present counts the cells that have a value; the cell of rank r (from 0, in the order of offsets) came from line
//
//	first + r stride                             width 0
//	first + bits[r]                              width > 0
//	first + r stride + bits[0] + ... + bits[r]   width > 0, summed
//
// with bits[i] the i-th number of width bits, lowest bit first. The head is short enough for two columns of
// watcher.BlockSize int32 cells, with their keys and bbolt's 16 bytes a page and 16 an element, to fill eight pages of 4 KiB.
const columnHead = 16

const (
	shapeWide = 1 << iota
	shapeSparse
	shapeFull // no cell up to the length is missing
	shapeSummed
	shapeShort // dense only
	shapeEnd
)

// layer is a column as it lies in the map.
type layer struct {
	shape         byte
	decimals      int
	n, present    int
	width         int
	first, stride uint32
	offsets       []byte
	values        []byte
	long          []byte // of a short column: what does not fit its cells
	lines         []byte
}

func (l *layer) cell() int {
	switch {
	case l.shape&shapeWide != 0:
		return 8
	case l.shape&shapeShort != 0:
		return shortCell
	}
	return 4
}

// parseLayer takes a column's value apart; it copies nothing. why is "" when the value makes sense.
func parseLayer(v []byte) (l layer, why string) {
	if len(v) < columnHead {
		return l, "column is cut short"
	}
	l = layer{shape: v[0], decimals: int(v[1]), n: int(binary.LittleEndian.Uint16(v[2:])), present: int(binary.LittleEndian.Uint16(v[4:])),
		width: int(v[6]), first: binary.LittleEndian.Uint32(v[8:]), stride: binary.LittleEndian.Uint32(v[12:])}
	offsets := 0
	if l.shape&shapeSparse != 0 {
		offsets = 2 * l.n
	}
	values := offsets + l.n*l.cell()
	long := values + longCell*int(v[7])
	v = v[columnHead:]
	if l.shape >= shapeEnd || l.width > 32 || l.n > watcher.BlockSize || l.present > l.n || l.decimals > rules.Places ||
		l.shape&shapeShort != 0 && l.shape&(shapeWide|shapeSparse) != 0 || l.shape&shapeShort == 0 && long != values ||
		len(v) != long+(l.present*l.width+7)/8 {
		return l, "column does not have the length that its head says"
	}
	l.offsets, l.values, l.long, l.lines = v[:offsets:offsets], v[offsets:values:values], v[values:long:long], v[long:]
	return l, ""
}

// appendColumn encodes a column.
func appendColumn(dst []byte, c *watcher.Column) []byte {
	shape, present := byte(0), c.Len()
	cell := 4
	if c.V64 != nil {
		shape, cell = shapeWide, 8
	}
	present -= missing(c)
	switch {
	case present == c.Len():
		shape |= shapeFull
	case present*(2+cell) < c.Len()*cell:
		shape |= shapeSparse
	}
	n := c.Len()
	longs, short := longs(c)
	switch {
	case shape&shapeSparse != 0:
		n, longs = present, 0
	case short:
		shape |= shapeShort
	default:
		longs = 0
	}
	lines := measure(c, present)
	if lines.summed {
		shape |= shapeSummed
	}
	dst = append(dst, shape, c.Decimals)
	dst = binary.LittleEndian.AppendUint16(dst, uint16(n))
	dst = binary.LittleEndian.AppendUint16(dst, uint16(present))
	dst = append(dst, byte(lines.width), byte(longs))
	dst = binary.LittleEndian.AppendUint32(dst, lines.first)
	dst = binary.LittleEndian.AppendUint32(dst, lines.stride)
	switch {
	case shape&shapeSparse != 0:
		dst = appendSparse(dst, c)
	case shape&shapeShort != 0:
		dst = appendShort(dst, c, longs)
	default:
		dst = appendDense(dst, c)
	}
	return lines.append(dst)
}

func missing(c *watcher.Column) (n int) {
	for _, v := range c.V32 {
		if v == watcher.Missing32 {
			n++
		}
	}
	for _, v := range c.V64 {
		if v == watcher.Missing64 {
			n++
		}
	}
	return n
}

func appendDense(dst []byte, c *watcher.Column) []byte {
	for _, v := range c.V32 {
		dst = binary.LittleEndian.AppendUint32(dst, uint32(v))
	}
	for _, v := range c.V64 {
		dst = binary.LittleEndian.AppendUint64(dst, uint64(v))
	}
	return dst
}

func appendSparse(dst []byte, c *watcher.Column) []byte {
	for i := range c.Len() {
		if has(c, i) {
			dst = binary.LittleEndian.AppendUint16(dst, uint16(i))
		}
	}
	for _, v := range c.V32 {
		if v != watcher.Missing32 {
			dst = binary.LittleEndian.AppendUint32(dst, uint32(v))
		}
	}
	for _, v := range c.V64 {
		if v != watcher.Missing64 {
			dst = binary.LittleEndian.AppendUint64(dst, uint64(v))
		}
	}
	return dst
}

func has(c *watcher.Column, i int) bool {
	if c.V32 != nil {
		return c.V32[i] != watcher.Missing32
	}
	return c.V64[i] != watcher.Missing64
}

// find gives the value of an offset as stored and its rank among the cells that have one.
func (l *layer) find(offset int) (v int64, rank int, ok bool) {
	if l.shape&shapeSparse != 0 {
		rank = sort.Search(l.n, func(i int) bool { return int(binary.LittleEndian.Uint16(l.offsets[2*i:])) >= offset })
		if rank == l.n || int(binary.LittleEndian.Uint16(l.offsets[2*rank:])) != offset {
			return 0, 0, false
		}
		return l.value(rank), rank, true
	}
	if offset >= l.n {
		return 0, 0, false
	}
	v = l.value(offset)
	if v == watcher.Missing64 {
		return 0, 0, false
	}
	return v, l.rank(offset), true
}

// value is the i-th stored value, Missing64 where it is missing.
func (l *layer) value(i int) int64 {
	switch {
	case l.shape&shapeWide != 0:
		return int64(binary.LittleEndian.Uint64(l.values[8*i:]))
	case l.shape&shapeShort != 0:
		return l.shortValue(i)
	}
	if v := int32(binary.LittleEndian.Uint32(l.values[4*i:])); v != watcher.Missing32 {
		return int64(v)
	}
	return watcher.Missing64
}

func (l *layer) rank(offset int) int {
	if l.shape&shapeFull != 0 {
		return offset
	}
	rank := 0
	for i := range offset {
		if l.value(i) != watcher.Missing64 {
			rank++
		}
	}
	return rank
}

// line is the source line of the cell of a rank.
func (l *layer) line(rank int) uint32 {
	switch {
	case l.width == 0:
		return l.first + uint32(rank)*l.stride
	case l.shape&shapeSummed == 0:
		return l.first + bitsAt(l.lines, rank, l.width)
	}
	line := l.first + uint32(rank)*l.stride
	for i := range rank + 1 {
		line += bitsAt(l.lines, i, l.width)
	}
	return line
}

// bitsAt is the i-th number of width bits.
func bitsAt(b []byte, i, width int) uint32 {
	at := i * width
	var word [8]byte
	copy(word[:], b[at/8:])
	return uint32(binary.LittleEndian.Uint64(word[:]) >> (at % 8) & (1<<width - 1))
}

// linePlan is how the lines of a column are stored.
type linePlan struct {
	lines         []uint32 // of the present cells; nil when first and stride say it all
	first, stride uint32
	width         int
	summed        bool
}

// measure picks the shortest way to store the lines of the present cells.
func measure(c *watcher.Column, present int) linePlan {
	if c.Lines.At == nil || present == 0 {
		return linePlan{first: c.Lines.First, stride: c.Lines.Stride}
	}
	lines := presentLines(c, present)
	low, high := lines[0], lines[0]
	least, most := uint32(1<<32-1), uint32(0)
	rising := true
	for i, v := range lines[1:] {
		low, high = min(low, v), max(high, v)
		rising = rising && v >= lines[i]
		least, most = min(least, v-lines[i]), max(most, v-lines[i])
	}
	flat := linePlan{lines: lines, first: low, width: bits.Len32(high - low)}
	if !rising || len(lines) == 1 {
		return flat
	}
	steps := linePlan{lines: lines, first: lines[0], stride: least, width: bits.Len32(most - least), summed: most > least}
	if flat.width < steps.width {
		return flat
	}
	return steps
}

func presentLines(c *watcher.Column, present int) []uint32 {
	if present == c.Len() {
		return c.Lines.At[:present]
	}
	lines := make([]uint32, 0, present)
	for i := range c.Len() {
		if has(c, i) {
			lines = append(lines, c.Line(i))
		}
	}
	return lines
}

func (p linePlan) append(dst []byte) []byte {
	if p.width == 0 {
		return dst
	}
	var word uint64
	used, last := 0, p.first-p.stride
	for _, line := range p.lines {
		v := line - p.first
		if p.summed {
			v, last = line-last-p.stride, line
		}
		word |= uint64(v) << used
		for used += p.width; used >= 8; used -= 8 {
			dst = append(dst, byte(word))
			word >>= 8
		}
	}
	if used > 0 {
		dst = append(dst, byte(word))
	}
	return dst
}
