package ledger

import (
	"slices"

	"strayd/rules"
	"strayd/watcher"
)

// The parts of a flag that are often absent, or the same as in the file row of the step that raised it, have a bit each.
const (
	flagLow = 1 << iota
	flagHigh
	flagZ
	flagTail
	flagLog10
	flagReturn
	flagOwnFile  // feed and file are those of the file row
	flagReceived // raised when the file was received
	flagLine
	flagNote
	flagLooksLike
	flagShare
	flagImplied
	flagReference
	flagReferenceReturn
	flagResidual
)

// What people did about it has bits of its own.
const (
	flagActed   = 1 << (20 + iota) // somebody did something
	flagDecided                    // something is decided
	flagDecides                    // the last act is what decided it
)

// flagRow is a flag as stored. With the bits flagOwnFile and flagReceived, feed, file and time stand in the file row.
type flagRow struct {
	bits   uint64
	series uint32
	flag   rules.Flag
}

// rowOf prepares a flag for packing; f is the file row of the step that writes it.
func rowOf(flag *rules.Flag, series uint32, step uint32, f *watcher.FileRow) flagRow {
	r := flagRow{series: series, flag: *flag}
	set := func(bit uint64, on bool) {
		if on {
			r.bits |= bit
		}
	}
	for _, n := range append(figures(flag), weights(flag)...) {
		set(n.bit, n.num.OK)
	}
	set(flagReturn, flag.Return != rules.Missing)
	own := flag.Step == step && f.Outcome != ""
	set(flagOwnFile, own && flag.Feed == f.File.Feed && flag.File == f.File.Name)
	set(flagReceived, own && nanos(flag.RaisedAt) == nanos(f.Received))
	set(flagLine, flag.Line != 0)
	set(flagNote, flag.Note != "")
	set(flagLooksLike, flag.LooksLike != "")
	set(flagReference, flag.Reference != "")
	r.bits |= actBits(flag)
	return r
}

// figure is a number of a flag that may be absent, with its bit.
type figure struct {
	bit uint64
	num *rules.Num
}

// figures are the numbers that a range gives.
func figures(f *rules.Flag) []figure {
	return []figure{{flagLow, &f.Low}, {flagHigh, &f.High}, {flagZ, &f.Z}, {flagTail, &f.Tail}, {flagLog10, &f.Log10}}
}

// weights are the numbers that the weighing of causes gives.
func weights(f *rules.Flag) []figure {
	return []figure{{flagShare, &f.Share}, {flagImplied, &f.Implied}, {flagReferenceReturn, &f.ReferenceReturn}, {flagResidual, &f.Residual}}
}

func (p *packer) figures(bits uint64, list []figure) {
	for _, n := range list {
		if bits&n.bit != 0 {
			p.float(n.num.V)
		}
	}
}

func (u *unpacker) figures(bits uint64, list []figure) {
	for _, n := range list {
		if bits&n.bit != 0 {
			*n.num = rules.Some(u.float())
		}
	}
}

func packFlag(dst []byte, r *flagRow) []byte {
	p, f := packer{dst}, &r.flag
	p.uint(r.bits)
	p.byte(byte(indexOf(rules.Kinds, f.Kind)))
	p.byte(byte(indexOf(rules.Standings, f.Standing)))
	p.uint(uint64(f.Step))
	p.int(int64(f.Date))
	p.uint(uint64(r.series + 1)) // no series is 0
	p.text(f.Group)
	p.text(f.Range)
	p.figures(r.bits, figures(f))
	if r.bits&flagReturn != 0 {
		p.int(int64(f.Return))
	}
	if r.bits&flagOwnFile == 0 {
		p.text(f.Feed)
		p.text(f.File)
	}
	if r.bits&flagReceived == 0 {
		p.time(f.RaisedAt)
	}
	if r.bits&flagLine != 0 {
		p.uint(uint64(f.Line))
	}
	if r.bits&flagNote != 0 {
		p.text(f.Note)
	}
	if r.bits&flagLooksLike != 0 {
		p.byte(byte(indexOf(rules.Causes, f.LooksLike)))
	}
	if r.bits&flagReference != 0 {
		p.text(f.Reference)
	}
	p.figures(r.bits, weights(f))
	r.packActs(&p)
	return p.b
}

// unpackFront reads what a flag begins with.
func unpackFront(u *unpacker) (r flagRow, ok bool) {
	r.bits = u.uint()
	kind, standing := int(u.byte()), int(u.byte())
	if kind >= len(rules.Kinds) || standing >= len(rules.Standings) {
		return r, false
	}
	r.flag.Kind, r.flag.Standing = rules.Kinds[kind], rules.Standings[standing]
	r.flag.Step = uint32(u.uint())
	r.flag.Date = rules.Date(u.int())
	r.series = uint32(u.uint()) - 1
	return r, true
}

func unpackFlag(ref uint64, v []byte) (r flagRow, ok bool) {
	u := unpacker{b: v}
	if r, ok = unpackFront(&u); !ok {
		return r, false
	}
	f := &r.flag
	f.Ref = ref
	f.Group = u.text()
	f.Range = u.text()
	u.figures(r.bits, figures(f))
	f.Return = rules.Missing
	if r.bits&flagReturn != 0 {
		f.Return = rules.Units(u.int())
	}
	r.unpackSource(&u)
	if !r.unpackCause(&u) {
		return r, false
	}
	r.unpackActs(&u)
	return r, u.whole()
}

func (r *flagRow) unpackCause(u *unpacker) (ok bool) {
	if r.bits&flagLooksLike != 0 {
		cause := int(u.byte())
		if cause >= len(rules.Causes) {
			return false
		}
		r.flag.LooksLike = rules.Causes[cause]
	}
	if r.bits&flagReference != 0 {
		r.flag.Reference = u.text()
	}
	u.figures(r.bits, weights(&r.flag))
	return true
}

func (r *flagRow) unpackSource(u *unpacker) {
	if r.bits&flagOwnFile == 0 {
		r.flag.Feed = u.text()
		r.flag.File = u.text()
	}
	if r.bits&flagReceived == 0 {
		r.flag.RaisedAt = u.time()
	}
	if r.bits&flagLine != 0 {
		r.flag.Line = uint32(u.uint())
	}
	if r.bits&flagNote != 0 {
		r.flag.Note = u.text()
	}
}

// marks says whether a flag of this kind is about a value itself.
func marks(kind byte) bool {
	return slices.Contains(rules.Concluded, rules.Kinds[kind])
}
