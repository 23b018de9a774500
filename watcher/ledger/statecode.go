package ledger

import (
	"encoding/binary"
	"math"
	"math/bits"

	"strayd/rules"
	"strayd/watcher"
)

// A state's value after its seal: upto date, count of series, then five runs of integers (N, days since Last, Sum low and
// high, Sq), each less its least and stored in as many bytes as the largest needs, then the floats of Var.

func packState(dst []byte, s *watcher.State) []byte {
	p := packer{dst}
	p.int(int64(s.Upto))
	p.uint(uint64(len(s.N)))
	p.byte(boolByte(s.Var != nil))
	p.run(len(s.N), func(i int) watcher.Int128 { return watcher.Int128{Lo: uint64(s.N[i])} })
	p.run(len(s.Last), func(i int) watcher.Int128 { return wide64(int64(s.Upto) - int64(s.Last[i])) })
	p.run(len(s.Sum), func(i int) watcher.Int128 { return s.Sum[i] })
	p.run(len(s.Sq), func(i int) watcher.Int128 { return s.Sq[i] })
	for _, v := range s.Var {
		p.float(v)
	}
	return p.b
}

func boolByte(b bool) byte {
	if b {
		return 1
	}
	return 0
}

func wide64(v int64) watcher.Int128 { return watcher.Int128{Hi: uint64(v >> 63), Lo: uint64(v)} }

func unpackState(v []byte) (*watcher.State, bool) {
	u := unpacker{b: v}
	s := &watcher.State{Upto: rules.Date(u.int())}
	n := u.uint()
	weighted := u.byte() == 1
	if n > watcher.BlockSize {
		return nil, false
	}
	s.N, s.Last = make([]uint32, n), make([]rules.Date, n)
	s.Sum, s.Sq = make([]watcher.Int128, n), make([]watcher.Int128, n)
	u.run(int(n), func(i int, v watcher.Int128) { s.N[i] = uint32(v.Lo) })
	u.run(int(n), func(i int, v watcher.Int128) { s.Last[i] = rules.Date(int64(s.Upto) - int64(v.Lo)) })
	u.run(int(n), func(i int, v watcher.Int128) { s.Sum[i] = v })
	u.run(int(n), func(i int, v watcher.Int128) { s.Sq[i] = v })
	if weighted {
		s.Var = make([]float64, n)
		for i := range s.Var {
			s.Var[i] = u.float()
		}
	}
	return s, u.whole()
}

// run stores n integers of 128 bits: the least of them (as two's complement), then what each exceeds it by. The sum of least
// and excess is modulo 2^128, so any 128 bits come back whether they were meant with a sign or not.
func (p *packer) run(n int, at func(i int) watcher.Int128) {
	if n == 0 {
		return
	}
	least := at(0)
	for i := 1; i < n; i++ {
		if v := at(i); less(v, least) {
			least = v
		}
	}
	width := 0
	for i := range n {
		width = max(width, bytesOf(minus(at(i), least)))
	}
	p.b = binary.LittleEndian.AppendUint64(p.b, least.Lo)
	p.b = binary.LittleEndian.AppendUint64(p.b, least.Hi)
	p.byte(byte(width))
	for i := range n {
		var word [16]byte
		v := minus(at(i), least)
		binary.LittleEndian.PutUint64(word[:], v.Lo)
		binary.LittleEndian.PutUint64(word[8:], v.Hi)
		p.raw(word[:width])
	}
}

func (u *unpacker) run(n int, set func(i int, v watcher.Int128)) {
	if n == 0 {
		return
	}
	head := u.raw(17)
	if head == nil || head[16] > 16 {
		u.bad = true
		return
	}
	least := watcher.Int128{Lo: binary.LittleEndian.Uint64(head), Hi: binary.LittleEndian.Uint64(head[8:])}
	width := int(head[16])
	body := u.raw(n * width)
	if u.bad {
		return
	}
	for i := range n {
		var word [16]byte
		copy(word[:], body[i*width:][:width])
		set(i, plus(watcher.Int128{Lo: binary.LittleEndian.Uint64(word[:]), Hi: binary.LittleEndian.Uint64(word[8:])}, least))
	}
}

// less compares as signed integers.
func less(a, b watcher.Int128) bool {
	if a.Hi != b.Hi {
		return int64(a.Hi) < int64(b.Hi)
	}
	return a.Lo < b.Lo
}

func minus(a, b watcher.Int128) watcher.Int128 {
	lo, borrow := bits.Sub64(a.Lo, b.Lo, 0)
	hi, _ := bits.Sub64(a.Hi, b.Hi, borrow)
	return watcher.Int128{Hi: hi, Lo: lo}
}

func plus(a, b watcher.Int128) watcher.Int128 {
	lo, carry := bits.Add64(a.Lo, b.Lo, 0)
	hi, _ := bits.Add64(a.Hi, b.Hi, carry)
	return watcher.Int128{Hi: hi, Lo: lo}
}

func bytesOf(v watcher.Int128) int {
	if v.Hi != 0 {
		return 8 + (bits.Len64(v.Hi)+7)/8
	}
	return (bits.Len64(v.Lo) + 7) / 8
}

// cells of used values after the seal: count u16, offsets u16, values int64, little endian.

func packCells(dst []byte, c *watcher.UsedColumn) []byte {
	dst = binary.LittleEndian.AppendUint16(dst, uint16(len(c.Offsets)))
	for _, o := range c.Offsets {
		dst = binary.LittleEndian.AppendUint16(dst, o)
	}
	for _, v := range c.Values {
		dst = binary.LittleEndian.AppendUint64(dst, uint64(v))
	}
	return dst
}

// cells are used values as they lie in the map.
type cells struct {
	n               int
	offsets, values []byte
}

func parseCells(v []byte) (cells, bool) {
	if len(v) < 2 {
		return cells{}, false
	}
	n := int(binary.LittleEndian.Uint16(v))
	if len(v) != 2+10*n {
		return cells{}, false
	}
	return cells{n, v[2 : 2+2*n], v[2+2*n:]}, true
}

func (c cells) offset(i int) int  { return int(binary.LittleEndian.Uint16(c.offsets[2*i:])) }
func (c cells) value(i int) int64 { return int64(binary.LittleEndian.Uint64(c.values[8*i:])) }

func packScale(dst []byte, s *watcher.GroupScale) []byte {
	dst = binary.LittleEndian.AppendUint64(dst, math.Float64bits(s.Deviation))
	return binary.LittleEndian.AppendUint32(dst, s.Series)
}

func unpackScale(v []byte, s *watcher.GroupScale) bool {
	if len(v) != 12 {
		return false
	}
	s.Deviation = math.Float64frombits(binary.LittleEndian.Uint64(v))
	s.Series = binary.LittleEndian.Uint32(v[8:])
	return true
}
