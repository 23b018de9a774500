package rules

// Cause is what may lie behind a value that is not ordinary. It is a hypothesis, never applied.
type Cause string

// The causes. The words are read by other programs.
const (
	CauseX100       Cause = "x100"
	CauseX10000     Cause = "x10000"
	CauseX10        Cause = "x10"
	CauseDiv100     Cause = "div100"
	CauseSign       Cause = "sign"
	CauseRepeat     Cause = "repeat"
	CauseZero       Cause = "zero"
	CauseShifted    Cause = "shifted-date"
	CauseSpike      Cause = "spike-reversal"
	CauseMissed     Cause = "missed-distribution"
	CauseDoubled    Cause = "double-distribution"
	CauseSplit      Cause = "split"
	CauseFXMissing  Cause = "fx-missing"
	CauseFXTwice    Cause = "fx-twice"
	CauseSwapped    Cause = "swapped"
	CauseCumulative Cause = "cumulative"
	CauseReference  Cause = "reference-wrong"
	CauseMarket     Cause = "market"
	CauseGenuine    Cause = "genuine"
)

// Causes lists every cause. The order is also their number in the ledger: only append.
var Causes = []Cause{CauseX100, CauseX10000, CauseX10, CauseDiv100, CauseSign, CauseRepeat, CauseZero, CauseShifted, CauseSpike, CauseMissed,
	CauseDoubled, CauseSplit, CauseFXMissing, CauseFXTwice, CauseSwapped, CauseCumulative, CauseReference, CauseMarket, CauseGenuine}

// Share is the weight of one cause, given that the day is not ordinary.
type Share struct {
	Cause   Cause
	Share   float64 // 0 to 1
	Implied Num     // the return that it implies, a fraction
}
