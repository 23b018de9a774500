package ledger

import (
	"slices"

	"strayd/rules"
)

// What a person did about a flag stands at the end of its row: the last act, and what was decided where that is another.

func packAct(p *packer, a *rules.Act) {
	p.byte(byte(indexOf(rules.Deeds, a.Deed)))
	p.uint(uint64(a.Step))
	p.int(int64(a.By.UID))
	p.text(a.By.Name)
	p.time(a.At)
	p.byte(byte(1 + slices.Index(rules.Conclusions, a.Conclusion))) // none is 0
	p.int(int64(a.Value))
	p.byte(byte(1 + slices.Index(rules.Reasons, a.Reason)))
	p.text(a.Note)
	p.text(a.Override)
	p.int(int64(a.Until))
	second := byte(0)
	if a.Second {
		second = 1
	}
	p.byte(second)
}

func unpackAct(u *unpacker) *rules.Act {
	a := &rules.Act{}
	deed := int(u.byte())
	a.Step = uint32(u.uint())
	a.By.UID = int(u.int())
	a.By.Name = u.text()
	a.At = u.time()
	conclusion := int(u.byte())
	a.Value = rules.Units(u.int())
	reason := int(u.byte())
	a.Note, a.Override = u.text(), u.text()
	a.Until = rules.Date(u.int())
	second := u.byte()
	if deed >= len(rules.Deeds) || conclusion > len(rules.Conclusions) || reason > len(rules.Reasons) || second > 1 {
		u.bad = true
		return nil
	}
	a.Deed, a.Second = rules.Deeds[deed], second == 1
	if conclusion > 0 {
		a.Conclusion = rules.Conclusions[conclusion-1]
	}
	if reason > 0 {
		a.Reason = rules.Reasons[reason-1]
	}
	return a
}

// packActs writes what the bits say is there.
func (r *flagRow) packActs(p *packer) {
	if r.bits&flagActed != 0 {
		packAct(p, r.flag.Last)
	}
	if r.bits&flagDecided != 0 {
		packAct(p, r.flag.Decided)
	}
}

func (r *flagRow) unpackActs(u *unpacker) {
	if r.bits&flagActed != 0 {
		r.flag.Last = unpackAct(u)
	}
	switch {
	case r.bits&flagDecided != 0:
		r.flag.Decided = unpackAct(u)
	case r.bits&flagDecides != 0:
		r.flag.Decided = r.flag.Last
	}
}

// actBits say which acts a flag's row has.
func actBits(f *rules.Flag) (bits uint64) {
	if f.Last != nil {
		bits |= flagActed
	}
	switch {
	case f.Decided == nil:
	case f.Last != nil && f.Last.Same(f.Decided):
		bits |= flagDecides
	default:
		bits |= flagDecided
	}
	return bits
}
