package ledger

import (
	"encoding/binary"
	"sort"

	"strayd/watcher"
)

// Short cells take three bytes. Those of a few values that need four hold a mark instead, and the value stands in a list behind them:
// offset u16, value int32 each, by offset.
const (
	shortCell    = 3
	shortMissing = -1 << 23
	shortLong    = shortMissing + 1 // the value stands in the list
	mostLong     = 255
	longCell     = 6
)

// longs counts the values of a column that do not fit a short cell; ok is false when short cells do not pay.
func longs(c *watcher.Column) (n int, ok bool) {
	if c.V32 == nil {
		return 0, false
	}
	for _, v := range c.V32 {
		if uint32(v-shortLong-1) >= 1<<24-2 && v != watcher.Missing32 {
			n++
		}
	}
	return n, n <= mostLong && longCell*n < len(c.V32)
}

// appendShort encodes a column in short cells.
func appendShort(dst []byte, c *watcher.Column, longs int) []byte {
	for _, v := range c.V32 {
		switch {
		case v == watcher.Missing32:
			v = shortMissing
		case uint32(v-shortLong-1) >= 1<<24-2:
			v = shortLong
		}
		dst = append(dst, byte(v), byte(v>>8), byte(v>>16))
	}
	if longs == 0 {
		return dst
	}
	for i, v := range c.V32 {
		if uint32(v-shortLong-1) >= 1<<24-2 && v != watcher.Missing32 {
			dst = binary.LittleEndian.AppendUint16(dst, uint16(i))
			dst = binary.LittleEndian.AppendUint32(dst, uint32(v))
		}
	}
	return dst
}

// short is the i-th short cell as it lies there.
func (l *layer) short(i int) int32 {
	b := l.values[shortCell*i : shortCell*i+shortCell]
	return int32(uint32(b[0])<<8|uint32(b[1])<<16|uint32(b[2])<<24) >> 8
}

// shortValue is the value of a short cell, Missing64 where it is missing.
func (l *layer) shortValue(i int) int64 {
	switch v := l.short(i); v {
	case shortMissing:
		return watcher.Missing64
	case shortLong:
		n := sort.Search(len(l.long)/longCell, func(n int) bool { return l.longAt(n) >= i })
		if n < len(l.long)/longCell && l.longAt(n) == i {
			return l.longValue(n)
		}
		return watcher.Missing64 // the ledger's check says so: see verifier.column
	default:
		return int64(v)
	}
}

func (l *layer) longAt(n int) int { return int(binary.LittleEndian.Uint16(l.long[longCell*n:])) }

func (l *layer) longValue(n int) int64 {
	return int64(int32(binary.LittleEndian.Uint32(l.long[longCell*n+2:])))
}

// writeShort decodes dense short cells.
func (l *layer) writeShort(dst []int64, from int, mul int64) {
	src := l.values[shortCell*from:]
	if l.shape&shapeFull != 0 {
		shortFull(dst, src, mul)
	} else {
		for i := range dst {
			if dst[i] = watcher.Missing64; l.short(from+i) != shortMissing {
				dst[i] = int64(l.short(from+i)) * mul
			}
		}
	}
	for n := range len(l.long) / longCell {
		if at := l.longAt(n) - from; at >= 0 && at < len(dst) {
			dst[at] = l.longValue(n) * mul
		}
	}
}

// shortFull decodes short cells none of which is missing, eight at a time.
func shortFull(dst []int64, src []byte, mul int64) {
	at := 0
	for ; at+8 <= len(dst); at += 8 {
		d, s := (*[8]int64)(dst[at:]), (*[24]byte)(src[shortCell*at:])
		a, b, c := int64(binary.LittleEndian.Uint64(s[0:8])), int64(binary.LittleEndian.Uint64(s[8:16])), int64(binary.LittleEndian.Uint64(s[16:24]))
		d[0], d[1], d[2] = a<<40>>40*mul, a<<16>>40*mul, int64(uint64(a)>>48|uint64(b)<<16)<<40>>40*mul
		d[3], d[4] = b<<32>>40*mul, b<<8>>40*mul
		d[5] = int64(uint64(b)>>56|uint64(c)<<8) << 40 >> 40 * mul
		d[6], d[7] = c<<24>>40*mul, c>>40*mul
	}
	for ; at < len(dst); at++ {
		s := (*[shortCell]byte)(src[shortCell*at:])
		dst[at] = int64(int32(uint32(s[0])<<8|uint32(s[1])<<16|uint32(s[2])<<24)>>8) * mul
	}
}

// longsFit says whether the list belongs to the cells: one entry, ascending, for each marked cell and for no other.
func (l *layer) longsFit() bool {
	if l.shape&shapeShort == 0 {
		return true
	}
	marked := 0
	for i := range l.n {
		if l.short(i) == shortLong {
			marked++
		}
	}
	last := -1
	for n := range len(l.long) / longCell {
		at := l.longAt(n)
		if at <= last || at >= l.n || l.short(at) != shortLong {
			return false
		}
		last = at
	}
	return marked == len(l.long)/longCell
}
