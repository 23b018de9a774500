// Package causes weighs what may lie behind a value that does not fit: a wrong scale, a lost sign, a value sent twice, a missed
// distribution, a move of the whole market, or something that happened.
//
// A Pool holds the series that are judged together, with their references and currencies, and goes forward one date at a time. What it
// says of a date depends on the values of that date and on the Memory dates before it, on nothing else: a pool that is made anew and led
// through the last Memory dates says the same. Series without group, reference, currency and events, of which there may be millions, need
// no pool: a Lone weighs the few of their values that call for it.
//
// All windows go by dates, not by observations, and every bound on what enters them goes by values as they came. That is what keeps the
// memory finite: a window that was clipped by verdicts would remember what these remembered.
package causes

import "strayd/rules"

// Memory is how many of the newest dates a pool's state depends on: a line looks back span dates and a week, the log odds in it a run of
// depth, each over long dates of a scale, whose bounds look back guard dates of residuals, each of a slope that is up to two weeks old and
// looks back span dates itself.
const Memory = 720

// Member is one series of a pool. Benchmarks and currencies are members too.
type Member struct {
	ID        string
	Group     int // index into the names of groups, -1 for none
	Reference Reference
	FX        int             // the member whose return is that of the foreign currency in the base, -1 for none
	Events    []rules.Event   // of this series, by date
	Calendar  *rules.Calendar // of its business days; nil for Monday to Friday
	Feed      string          // that its values come by, "" where not known: what comes by one feed is a day off together
}

// Reference is what a member's residual is taken against.
type Reference struct {
	Kind   ReferenceKind
	Series int // the member, for Series
}

// ReferenceKind says where a reference comes from.
type ReferenceKind uint8

const (
	None   ReferenceKind = iota
	Series               // another member
	Peers                // the median of the group without the member itself
)

// Day is the values of one date.
type Day struct {
	Date   rules.Date
	Values []rules.Units // by member; rules.Missing where there is none
	// Fresh says by member which values are judged now; nil for all. The others are gone through once more: they enter the state as Known
	// says, in full where it says nothing, and need no view.
	Fresh []bool
	// Known says what was concluded of values of this date before: for dates that are gone through again, and after decisions. A pool
	// takes it over instead of its own conclusion; nil where every value is judged for the first time.
	Known []Known
}

// Known is what was concluded of one value.
type Known struct {
	Member int
	Use    Use
	Value  rules.Units // for Instead
}

// Use is how a value enters the windows of a pool.
type Use uint8

const (
	AsIs    Use = iota // in full: nothing was flagged, or somebody decided that it is genuine
	Clipped            // flagged and undecided
	Out                // an error without a value, or one that more than half speaks for
	Instead            // corrected to another value
)

// Result is what a pool says of one date.
type Result struct {
	Views []View // of the members whose value is not plainly ordinary, by member
	// Foreseen is by member what its reference foresees of the return, by what was known before the date and the reference's value on it;
	// absent where there is none, and where the member has no value.
	Foreseen []rules.Num
	// Reference is by member the return of its reference, absent where Foreseen is.
	Reference []rules.Num
	Earlier   []View        // what this date settles about a value of the date before, such as a spike that is reversed now
	Markets   []Market      // common moves, by group
	Wrong     []WrongSeries // references that do not fit the series which are held against them
	Shifted   []int         // members whose values belong to another date, together: a whole file is a day off
}

// View is what a pool says of one value. Figures of the reference are absent where there is none.
type View struct {
	Member          int
	Date            rules.Date
	Kind            rules.Kind    // doubtful, stale or repeat where the posterior lies beyond its line, else ""
	Causes          []rules.Share // the most probable first
	LooksLike       rules.Cause   // that which holds more than half, "" for none
	Share           float64       // of LooksLike
	Implied         rules.Num     // by LooksLike
	Out             bool          // an error holds more than half: the windows leave the value out
	Use             Use           // how the pool's own windows take it; what is not AsIs comes back as Known when the date is gone through again
	LogOdds, Line   float64       // of an error against anything else, and where doubt begins
	Reference       string        // id of the benchmark, or "peers"
	ReferenceReturn rules.Num
	Residual        rules.Num // return less what the reference foresees
	Deviation       rules.Num // of the residual
	Explained       bool      // beyond its own range, and the reference foresees it
	Z, OwnZ         float64   // in deviations: of the residual (of the return, without a reference), and of the return
}

// Market is a common move of a group.
type Market struct {
	Group     int
	Median    float64 // return, of the members that have a value
	MedianZ   float64 // of |z| under each member's own past
	Reporting int     // members with a value
	NotMoved  []int   // members that did not take part, and stayed inside their own watch line
	Otherwise []int   // members that did not take part, and moved beyond it in their own way
}

// WrongSeries is a reference that its followers agree is wrong.
type WrongSeries struct {
	Member    int
	Followers int       // how many were held against it
	Implied   rules.Num // what they imply for it
}
