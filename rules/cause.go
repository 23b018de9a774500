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

// Words say a cause to a person, after "looks like".
func (c Cause) Words() string {
	words := map[Cause]string{
		CauseX100: "a value 100 times too large", CauseX10000: "a value 10,000 times too large", CauseX10: "a value 10 times too large",
		CauseDiv100: "a value 100 times too small", CauseSign: "a value with the wrong sign", CauseRepeat: "the value of the date before, sent again",
		CauseZero: "a zero where a value is missing", CauseShifted: "the value of another date", CauseSpike: "a wrong price that the next date takes back",
		CauseMissed: "a distribution that is missing", CauseDoubled: "a distribution counted twice", CauseSplit: "a split that is missing",
		CauseFXMissing: "a return without its currency", CauseFXTwice: "a return with its currency counted twice",
		CauseSwapped: "the value of another series", CauseCumulative: "a return over several dates instead of one",
		CauseReference: "a wrong value of the series that others are held against", CauseMarket: "a move of its market",
		CauseGenuine: "something that did happen",
	}
	return words[c]
}

// Share is the weight of one cause, given that the day is not ordinary.
type Share struct {
	Cause   Cause
	Share   float64 // 0 to 1
	Implied Num     // the return that it implies, a fraction
}
