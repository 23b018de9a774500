package ledger

import "encoding/binary"

const (
	keyIdentity = "ledger"
	keyHead     = "head"
	keyTotals   = "totals"
	keyStaging  = "staging"

	identityMark = "strayd ledger"
)

// identity says that a file is a ledger, in which layout, and which one.
type identity struct {
	schema uint32
	id     [16]byte
}

func packIdentity(dst []byte, i identity) []byte {
	p := packer{dst}
	p.text(identityMark)
	p.uint(uint64(i.schema))
	p.raw(i.id[:])
	return p.b
}

func unpackIdentity(v []byte) (i identity, ok bool) {
	u := unpacker{b: v}
	mark := u.text()
	i.schema = uint32(u.uint())
	copy(i.id[:], u.raw(16))
	return i, mark == identityMark && !u.bad
}

// head says what is published.
type head struct {
	step     uint32
	names    uint32
	settings uint32
	passes   uint32
	nextRef  uint64
	records  uint64
	notices  uint64
	chain    [32]byte // hash of the last entry of the record, zero when there is none
}

func packHead(dst []byte, h head) []byte {
	p := packer{dst}
	for _, v := range []uint64{uint64(h.step), uint64(h.names), uint64(h.settings), uint64(h.passes), h.nextRef, h.records, h.notices} {
		p.uint(v)
	}
	p.raw(h.chain[:])
	return p.b
}

func unpackHead(v []byte) (h head, ok bool) {
	u := unpacker{b: v}
	h.step, h.names, h.settings, h.passes = uint32(u.uint()), uint32(u.uint()), uint32(u.uint()), uint32(u.uint())
	h.nextRef, h.records, h.notices = u.uint(), u.uint(), u.uint()
	copy(h.chain[:], u.raw(32))
	return h, u.whole()
}

// total is how many published values a bucket has and the sum of their checksums: a value that vanished, or an old one that
// came back, changes it.
type total struct{ count, sum uint64 }

type totals [buckets]total

func (t *total) add(seal uint32)  { t.count++; t.sum += uint64(seal) }
func (t *total) drop(seal uint32) { t.count--; t.sum -= uint64(seal) }

func sealOf(value []byte) uint32 { return binary.LittleEndian.Uint32(value) }

func packTotals(dst []byte, t *totals) []byte {
	for b := range t {
		dst = binary.LittleEndian.AppendUint64(dst, t[b].count)
		dst = binary.LittleEndian.AppendUint64(dst, t[b].sum)
	}
	return dst
}

func unpackTotals(v []byte) (t totals, ok bool) {
	if len(v) != len(t)*16 {
		return t, false
	}
	for b := range t {
		t[b] = total{binary.LittleEndian.Uint64(v[16*b:]), binary.LittleEndian.Uint64(v[16*b+8:])}
	}
	return t, true
}

// staging is what a batch of a step has written, or may have, before it was published: the spans of keys to sweep.
type staging struct {
	step  uint32
	spans []span
}

// span is an inclusive range of keys.
type span struct {
	in        bucket
	low, high []byte
}

func packStaging(dst []byte, s staging) []byte {
	p := packer{dst}
	p.uint(uint64(s.step))
	p.uint(uint64(len(s.spans)))
	for _, n := range s.spans {
		p.byte(byte(n.in))
		p.text(string(n.low))
		p.text(string(n.high))
	}
	return p.b
}

func unpackStaging(v []byte) (s staging, ok bool) {
	u := unpacker{b: v}
	s.step = uint32(u.uint())
	for range u.uint() {
		n := span{bucket(u.byte()), []byte(u.text()), []byte(u.text())}
		if u.bad || n.in >= buckets {
			return s, false
		}
		s.spans = append(s.spans, n)
	}
	return s, u.whole()
}
