package rules

import "time"

// Stage is why a flag that still asks something is passed on.
type Stage string

const (
	NotAnswered Stage = "not answered" // the reply-by time is over, and nobody has even acknowledged it
	BeforeHold  Stage = "before hold"  // the release that it blocks is near
	Held        Stage = "held"         // the release that it blocks is due
	StillOpen   Stage = "still open"   // it has asked for five business days, or for ten
)

// BeforeRelease is how long before a release a flag that blocks it is passed on.
const BeforeRelease = 30 * time.Minute

// Step is a moment at which a flag is passed on if it still asks then. Due is the time that it is about: the reply-by time or that of the
// release.
type Step struct {
	Stage Stage
	At    time.Time
	Due   time.Time
	Days  int // business days, of StillOpen
}

// Steps are the moments at which a flag is passed on that began to ask at a time and could be read at another, in no order. What was over
// by then is left out.
func (f *Flag) Steps(g *Group, asked, read time.Time, days *Calendar, zone *time.Location) (steps []Step) {
	add := func(s Step) {
		if s.At.After(asked) {
			steps = append(steps, s)
		}
	}
	if g.Reply > 0 {
		due := read.Add(g.Reply)
		add(Step{Stage: NotAnswered, At: due, Due: due})
	}
	if g.Release != nil && f.Date != NoDate {
		due := DueAt(*g.Release, f.Date, releaseZone(g.Release, zone))
		add(Step{Stage: BeforeHold, At: due.Add(-BeforeRelease), Due: due})
		add(Step{Stage: Held, At: due, Due: due})
	}
	civil := asked.In(zone)
	clock := time.Duration(civil.Hour())*time.Hour + time.Duration(civil.Minute())*time.Minute
	for _, n := range AgeBands[1:] {
		add(Step{Stage: StillOpen, At: Instant(days.Add(DateFrom(civil), n).Time().Add(clock), zone), Days: n})
	}
	return steps
}

func releaseZone(d *Due, zone *time.Location) *time.Location {
	if own, err := time.LoadLocation(d.Timezone); err == nil && d.Timezone != "" {
		return own
	}
	return zone
}

// Fits says whether the stage still holds for the flag on a day.
func (s Step) Fits(f *Flag, day Date) bool {
	if s.Stage == NotAnswered {
		standing := f.StandingOn(day)
		return standing == Open || standing == Reopened
	}
	return f.AsksOn(day)
}

// EscalationNews is that flags of one group reached a stage.
type EscalationNews struct {
	At    time.Time
	Group Group
	Step
	Flags []Flag
}
