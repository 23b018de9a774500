package rules

import "time"

// Kind is what a flag is about.
type Kind string

// The kinds of flag, in the order in which they are listed. The order is also their number in the ledger: only append.
const (
	KindBreach     Kind = "breach"
	KindLimit      Kind = "limit"
	KindDoubtful   Kind = "doubtful"
	KindStale      Kind = "stale"
	KindRepeat     Kind = "repeat"
	KindMissing    Kind = "missing"
	KindLate       Kind = "late"
	KindRefused    Kind = "refused"
	KindRestated   Kind = "restated"
	KindMarketDay  Kind = "market-day"
	KindDrift      Kind = "drift"
	KindVolatility Kind = "volatility"
	KindMisfit     Kind = "misfit"
)

// Kinds lists every kind in order.
var Kinds = []Kind{KindBreach, KindLimit, KindDoubtful, KindStale, KindRepeat, KindMissing, KindLate, KindRefused, KindRestated,
	KindMarketDay, KindDrift, KindVolatility, KindMisfit}

// OutOfLine lists the kinds that are about a value itself, which enters its window as `pending` says.
var OutOfLine = []Kind{KindBreach, KindLimit, KindDoubtful, KindStale, KindRepeat}

// Standing is where a flag is in its life.
type Standing string

// The standings, in the order of their numbers in the ledger: only append.
const (
	Open         Standing = "open"
	Acknowledged Standing = "acknowledged"
	Decided      Standing = "decided"
	SignedOff    Standing = "signed off"
	Waived       Standing = "waived"
	Reopened     Standing = "reopened"
	OfHistory    Standing = "history" // of a first load: asks nothing of anyone
)

// Standings lists every standing in order.
var Standings = []Standing{Open, Acknowledged, Decided, SignedOff, Waived, Reopened, OfHistory}

// Asks says whether a flag of this standing still asks something of a person.
func (s Standing) Asks() bool { return s == Open || s == Acknowledged || s == Reopened }

// Num is a figure that may be absent. It is never NaN or infinite.
type Num struct {
	V  float64
	OK bool
}

// Some is a present figure.
func Some(v float64) Num { return Num{v, true} }

// Flag is something that a person must look at. One a series, date and kind.
type Flag struct {
	Ref      uint64 // short number, from 1, given in the order of the record
	Step     uint32 // the step that raised it
	RaisedAt time.Time
	Date     Date
	Series   string // "" where the flag is not about one series
	Group    string
	Kind     Kind
	Range    string
	Return   Units // Missing where there is none
	Low      Num
	High     Num
	Z        Num
	Tail     Num
	Log10    Num
	// What it looks like, and what its reference says. The share and the implied return are of LooksLike.
	LooksLike       Cause
	Share           Num
	Implied         Num
	Reference       string // id of the benchmark, or "peers"; "" for none
	ReferenceReturn Num
	Residual        Num
	Standing        Standing
	Feed            string
	File            string
	Line            uint32 // 0 where there is none
	Note            string
	Last            *Act // what a person did last about it as it stands, nil when nobody did
	Decided         *Act // what was decided of it as it stands, nil when nothing is
}
