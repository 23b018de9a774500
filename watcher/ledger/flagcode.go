package ledger

import (
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
	set(flagLow, flag.Low.OK)
	set(flagHigh, flag.High.OK)
	set(flagZ, flag.Z.OK)
	set(flagTail, flag.Tail.OK)
	set(flagLog10, flag.Log10.OK)
	set(flagReturn, flag.Return != rules.Missing)
	own := flag.Step == step && f.Outcome != ""
	set(flagOwnFile, own && flag.Feed == f.File.Feed && flag.File == f.File.Name)
	set(flagReceived, own && nanos(flag.RaisedAt) == nanos(f.Received))
	set(flagLine, flag.Line != 0)
	set(flagNote, flag.Note != "")
	return r
}

func nums(f *rules.Flag) []*rules.Num {
	return []*rules.Num{&f.Low, &f.High, &f.Z, &f.Tail, &f.Log10}
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
	for i, n := range nums(f) {
		if r.bits>>i&1 == 1 {
			p.float(n.V)
		}
	}
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
	return p.b
}

func unpackFlag(ref uint64, v []byte) (r flagRow, ok bool) {
	u := unpacker{b: v}
	r.bits = u.uint()
	kind, standing := int(u.byte()), int(u.byte())
	if kind >= len(rules.Kinds) || standing >= len(rules.Standings) {
		return r, false
	}
	f := &r.flag
	f.Ref, f.Kind, f.Standing = ref, rules.Kinds[kind], rules.Standings[standing]
	f.Step = uint32(u.uint())
	f.Date = rules.Date(u.int())
	r.series = uint32(u.uint()) - 1
	f.Group = u.text()
	f.Range = u.text()
	for i, n := range nums(f) {
		if r.bits>>i&1 == 1 {
			*n = rules.Some(u.float())
		}
	}
	f.Return = rules.Missing
	if r.bits&flagReturn != 0 {
		f.Return = rules.Units(u.int())
	}
	r.unpackSource(&u)
	return r, u.whole()
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

// marks says whether a flag of this kind is about a value that is out of line.
func marks(kind byte) bool {
	switch rules.Kinds[kind] {
	case rules.KindBreach, rules.KindLimit, rules.KindDoubtful, rules.KindStale, rules.KindRepeat:
		return true
	}
	return false
}
