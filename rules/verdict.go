package rules

// Finding is what a verdict says in one word.
type Finding string

const (
	Inside    Finding = "inside"
	Watch     Finding = "watch"
	Breach    Finding = "breach"
	NotJudged Finding = "not judged"
)

// Verdict is what a pass concluded of one observation under one range.
type Verdict struct {
	Finding     Finding
	Provisional bool
	Why         string // reason and cure when provisional or not judged
	N           int    // used observations behind the estimate
	Mean        Num    // before factor and floor
	Deviation   Num    // before factor and floor
	Z           Num
	Tail        Num
	Log10       Num
	Lines
}

// Lines are the returns at which watch and breach begin. A side that a range does not look at is absent.
type Lines struct {
	WatchLow, WatchHigh Num
	Low, High           Num
}

// JudgeLimit is the verdict under a limit: a breach beyond either line, nothing estimated.
func JudgeLimit(l *Limit, x Units) Verdict {
	v := Verdict{Finding: Inside, Lines: Lines{Low: Some(l.Low.Float()), High: Some(l.High.Float())}}
	if x < l.Low || x > l.High {
		v.Finding = Breach
	}
	return v
}

// InWindow says whether a return of this size may ever enter a window.
func InWindow(x Units) bool { return x >= -WindowLimit && x <= WindowLimit }

// UsedValue is what the window of a range takes of a flagged return until somebody decides. v is the range's own verdict and
// limits are the limits that judge the series. ok is false when the value is left out.
//
// Under clip, the value is held to the range's breach lines, rounded to a unit toward the centre; where the range drew no line,
// to the limits; where there is no limit either, it is left out.
func UsedValue(p Pending, x Units, v *Verdict, limits []Limit) (used Units, ok bool) {
	switch {
	case !InWindow(x), p == LeaveOut:
		return Missing, false
	case p == Keep:
		return x, true
	case v.Low.OK || v.High.OK:
		return clipTo(x, v.Low, v.High)
	case len(limits) > 0:
		for _, l := range limits {
			x = min(max(x, l.Low), l.High)
		}
		return x, true
	}
	return Missing, false
}

func clipTo(x Units, low, high Num) (Units, bool) {
	if low.OK && x.Float() < low.V {
		x = unitsUp(low.V)
	}
	if high.OK && x.Float() > high.V {
		x = unitsDown(high.V)
	}
	return x, InWindow(x)
}
