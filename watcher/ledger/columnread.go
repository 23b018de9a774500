package ledger

import (
	"encoding/binary"

	"strayd/watcher"
)

// write decodes the cells of offsets from, from+1, ... into dst, each times mul, and Missing64 where there is none.
func (l *layer) write(dst []int64, from int, mul int64) {
	if l.shape&shapeSparse != 0 {
		clearCells(dst)
		l.writeSparse(dst, from, mul)
		return
	}
	n := max(0, min(l.n-from, len(dst)))
	if n > 0 {
		l.writeDense(dst[:n], from, mul)
	}
	clearCells(dst[n:])
}

func clearCells(dst []int64) {
	for i := range dst {
		dst[i] = watcher.Missing64
	}
}

func (l *layer) writeDense(dst []int64, from int, mul int64) {
	switch {
	case l.shape&shapeWide != 0:
		wide(dst, l.values[8*from:], mul)
	case l.shape&shapeShort != 0:
		l.writeShort(dst, from, mul)
	case l.shape&shapeFull != 0:
		full(dst, l.values[4*from:], mul)
	default:
		narrow(dst, l.values[4*from:], mul)
	}
}

// full decodes int32 cells none of which is missing, eight at a time (fixed arrays spare the checks of each index).
func full(dst []int64, src []byte, mul int64) {
	at := 0
	for ; at+8 <= len(dst); at += 8 {
		d, s := (*[8]int64)(dst[at:]), (*[32]byte)(src[4*at:])
		a, b := binary.LittleEndian.Uint64(s[0:8]), binary.LittleEndian.Uint64(s[8:16])
		d[0], d[1], d[2], d[3] = int64(int32(a))*mul, int64(int32(a>>32))*mul, int64(int32(b))*mul, int64(int32(b>>32))*mul
		a, b = binary.LittleEndian.Uint64(s[16:24]), binary.LittleEndian.Uint64(s[24:32])
		d[4], d[5], d[6], d[7] = int64(int32(a))*mul, int64(int32(a>>32))*mul, int64(int32(b))*mul, int64(int32(b>>32))*mul
	}
	narrow(dst[at:], src[4*at:], mul)
}

// narrow decodes int32 cells some of which are missing.
func narrow(dst []int64, src []byte, mul int64) {
	for i := range dst {
		v := int32(binary.LittleEndian.Uint32(src[4*i : 4*i+4]))
		if v == watcher.Missing32 {
			dst[i] = watcher.Missing64
		} else {
			dst[i] = int64(v) * mul
		}
	}
}

func wide(dst []int64, src []byte, mul int64) {
	for i := range dst {
		v := int64(binary.LittleEndian.Uint64(src))
		src = src[8:]
		if v != watcher.Missing64 {
			v *= mul
		}
		dst[i] = v
	}
}

// overlay writes only the cells that the layer has, over those of earlier layers.
func (l *layer) overlay(dst []int64, from int, mul int64) {
	if l.shape&shapeSparse != 0 {
		l.writeSparse(dst, from, mul)
		return
	}
	for i := range max(0, min(l.n-from, len(dst))) {
		if v := l.value(from + i); v != watcher.Missing64 {
			dst[i] = v * mul
		}
	}
}

func (l *layer) writeSparse(dst []int64, from int, mul int64) {
	for i := range l.n {
		at := int(binary.LittleEndian.Uint16(l.offsets[2*i:])) - from
		if at >= 0 && at < len(dst) {
			dst[at] = l.value(i) * mul
		}
	}
}
