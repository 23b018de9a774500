package rules

import (
	"fmt"
	"slices"
)

// Concluded lists the kinds of flag whose decision says what windows take of the value: those about a value itself.
var Concluded = []Kind{KindBreach, KindLimit, KindDoubtful, KindStale, KindRepeat, KindRestated}

// StandingOn is the standing on a day: a waiver that has run out leaves the flag open again.
func (f *Flag) StandingOn(day Date) Standing {
	if f.Standing == Waived && f.Last != nil && day > f.Last.Until {
		return Reopened
	}
	return f.Standing
}

// AwaitsSecond says that a second person must sign off what was decided, or the waiver.
func (f *Flag) AwaitsSecond() bool {
	return f.Standing == Decided && f.Decided != nil && f.Decided.Second || f.waiverAwaits()
}

// waiverAwaits says that a waiver does not hold before a second person signs it off.
func (f *Flag) waiverAwaits() bool {
	return f.Standing == Waived && f.Last != nil && f.Last.Deed == Waive && f.Last.Second
}

// AsksOn says whether the flag asks something of a person on a day.
func (f *Flag) AsksOn(day Date) bool { return f.StandingOn(day).Asks() || f.AwaitsSecond() }

// Unfinished says that the flag asks something of a person on some day if nobody does anything.
func (f *Flag) Unfinished() bool {
	return f.Standing.Asks() || f.Standing == Waived || f.AwaitsSecond()
}

// from lists the standings from which a deed leads on.
func (d Deed) from() []Standing {
	switch d {
	case Acknowledge:
		return []Standing{Open, Reopened}
	case Waive:
		return []Standing{Open, Acknowledged, Reopened, Waived}
	case SignOff:
		return []Standing{Decided}
	case Accept:
		return []Standing{Open, Acknowledged, Reopened, Waived, OfHistory, Decided}
	}
	return Standings
}

// To is the standing that an act leads to: a waiver that is signed off stays one.
func (a *Act) To() Standing {
	if a.Deed == SignOff && a.Until != NoDate {
		return Waived
	}
	return a.Deed.To()
}

// To is the standing that a deed leads to.
func (d Deed) To() Standing {
	switch d {
	case Acknowledge:
		return Acknowledged
	case Waive:
		return Waived
	case SignOff:
		return SignedOff
	}
	return Decided
}

// After is the flag after an act of a day, or why the act does not go with how it stands.
func (f Flag) After(a *Act, today Date) (Flag, error) {
	standing := f.StandingOn(today)
	switch {
	case a.Deed == SignOff && f.waiverAwaits() && standing == Waived:
		if f.Last.By.UID == a.By.UID {
			return f, fmt.Errorf("flag %d was waived by %s: a second person must sign it off", f.Ref, f.Last.By)
		}
	case !slices.Contains(a.Deed.from(), standing):
		return f, fmt.Errorf("flag %d is %s%s: %s", f.Ref, standing, f.lastWords(), a.Deed.needs())
	case a.Conclusion == Corrected && !slices.Contains(Concluded, f.Kind):
		return f, fmt.Errorf("flag %d (%s) is about no single value that could be corrected", f.Ref, f.Kind)
	case a.Deed == Decide && f.Decided != nil && f.decidedAs(a):
		return f, fmt.Errorf("flag %d is decided so already%s", f.Ref, f.lastWords())
	case a.Deed == Waive && a.Until < today:
		return f, fmt.Errorf("waived until %s, which is over", a.Until)
	case a.Deed == SignOff && a.Second && f.Decided != nil && f.Decided.By.UID == a.By.UID:
		return f, fmt.Errorf("flag %d was decided by %s: a second person must sign it off", f.Ref, f.Decided.By)
	}
	f.Standing, f.Last = a.To(), a
	if a.Deed == Decide || a.Deed == Accept {
		f.Decided = a
	}
	return f, nil
}

func (f *Flag) lastWords() string {
	if f.Last == nil {
		return ""
	}
	return " by " + f.Last.By.String()
}

// needs says what a deed needs first.
func (d Deed) needs() string {
	switch d {
	case SignOff:
		return "only what is decided is signed off"
	case Acknowledge:
		return "only an open flag is acknowledged"
	case Waive:
		return "only a flag that asks something is waived"
	}
	return "nothing is left to decide"
}

func (f *Flag) decidedAs(a *Act) bool {
	d := f.Decided
	return d.Conclusion == a.Conclusion && d.Value == a.Value && d.Reason == a.Reason && d.Note == a.Note && d.Override == a.Override
}
