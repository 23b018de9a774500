package ledger

import (
	"encoding/binary"
	"math"
	"time"
)

// packer appends the parts of a row to b. Integers are varints where they are usually small.
type packer struct{ b []byte }

func (p *packer) byte(v byte)      { p.b = append(p.b, v) }
func (p *packer) uint(v uint64)    { p.b = binary.AppendUvarint(p.b, v) }
func (p *packer) int(v int64)      { p.b = binary.AppendVarint(p.b, v) }
func (p *packer) float(v float64)  { p.b = binary.LittleEndian.AppendUint64(p.b, math.Float64bits(v)) }
func (p *packer) raw(v []byte)     { p.b = append(p.b, v...) }
func (p *packer) text(v string)    { p.uint(uint64(len(v))); p.b = append(p.b, v...) }
func (p *packer) time(t time.Time) { p.int(nanos(t)) }

// noTime stands for the zero time.
const noTime = math.MinInt64

func nanos(t time.Time) int64 {
	if t.IsZero() {
		return noTime
	}
	return t.UnixNano()
}

func fromNanos(n int64) time.Time {
	if n == noTime {
		return time.Time{}
	}
	return time.Unix(0, n).UTC()
}

// unpacker takes the parts off again. After the first part that is not there, bad is set and everything is zero.
type unpacker struct {
	b   []byte
	bad bool
}

func (u *unpacker) raw(n int) []byte {
	if n < 0 || n > len(u.b) {
		u.bad, u.b = true, nil
		return nil
	}
	v := u.b[:n:n]
	u.b = u.b[n:]
	return v
}

func (u *unpacker) byte() byte {
	if v := u.raw(1); v != nil {
		return v[0]
	}
	return 0
}

func (u *unpacker) uint() uint64 {
	v, n := binary.Uvarint(u.b)
	if n <= 0 {
		u.bad, u.b = true, nil
		return 0
	}
	u.b = u.b[n:]
	return v
}

func (u *unpacker) int() int64 {
	v, n := binary.Varint(u.b)
	if n <= 0 {
		u.bad, u.b = true, nil
		return 0
	}
	u.b = u.b[n:]
	return v
}

func (u *unpacker) float() float64 {
	if v := u.raw(8); v != nil {
		return math.Float64frombits(binary.LittleEndian.Uint64(v))
	}
	return 0
}

func (u *unpacker) text() string {
	n := u.uint()
	if n > uint64(len(u.b)) {
		u.bad, u.b = true, nil
		return ""
	}
	return string(u.raw(int(n)))
}

func (u *unpacker) time() time.Time { return fromNanos(u.int()) }

// whole says whether every part was there and nothing is left over.
func (u *unpacker) whole() bool { return !u.bad && len(u.b) == 0 }
