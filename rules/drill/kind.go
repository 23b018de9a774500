package drill

import (
	"slices"

	"strayd/rules"
)

// Kind is a kind of planted error, or a true move.
type Kind string

// The kinds, in the order of the printed table.
const (
	X100          Kind = "x100"
	X100File      Kind = "x100-file"
	Div100        Kind = "div100"
	Div100File    Kind = "div100-file"
	X10000        Kind = "x10000"
	X10           Kind = "x10"
	Sign          Kind = "sign"
	Repeat        Kind = "repeat"
	Zero          Kind = "zero"
	MissedListed  Kind = "missed-listed"   // a distribution that the calendar has, and the return lacks
	MissedNot     Kind = "missed-unlisted" // one that the calendar does not have
	Doubled       Kind = "doubled"         // a listed distribution counted twice
	Split         Kind = "split"
	SplitListed   Kind = "split-listed"
	Spike         Kind = "spike-reversal" // a wrong price for one day
	ShiftedFile   Kind = "shifted-file"   // five days of a feed carry the values of the day before
	EarlyFile     Kind = "early-file"     // and of the day after
	Swapped       Kind = "swapped"        // five days exchanged with a series of another group
	Cumulative    Kind = "cumulative"     // five days carry the return since their first
	ReferenceBad  Kind = "reference-wrong"
	FXMissing     Kind = "fx-missing" // the currency's return is left out for five days
	FXTwice       Kind = "fx-twice"   // and counted twice
	TruncatedFile Kind = "truncated-file"
	MissingFile   Kind = "missing-file"
	LateFile      Kind = "late-file"
	Move          Kind = "move"            // a true move of 6 deviations
	MoveAfter     Kind = "move-after-x100" // one ten days after an x100 that nobody decided
)

// Kinds lists every kind in order.
var Kinds = func() (out []Kind) {
	for _, n := range natures {
		out = append(out, n.kind)
	}
	return out
}()

// scope is what a kind takes hold of.
type scope uint8

const (
	oneSeries  scope = iota
	oneHelper        // a benchmark
	wholeFeed        // the values of a feed's file
	fileItself       // the file as such: its rows, or whether it comes
)

// nature is what a kind is.
type nature struct {
	kind  Kind
	scope scope
	days  int // that it lasts
	// A flag counts as caught on its day when it is about the days from..upto after the first: an error shows from the first of them on.
	from, upto int
	right      []rules.Cause // the causes that name it rightly; nil where a cause is not asked for
	story      string
}

var natures = []nature{
	{X100, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseX100}, "a row a hundred times too large"},
	{X100File, wholeFeed, 1, 0, 0, []rules.Cause{rules.CauseX100}, "a whole file a hundred times too large"},
	{Div100, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseDiv100}, "a row a hundred times too small"},
	{Div100File, wholeFeed, 1, 0, 0, []rules.Cause{rules.CauseDiv100}, "a whole file a hundred times too small"},
	{X10000, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseX10000}, "a row ten thousand times too large"},
	{X10, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseX10}, "a row ten times too large"},
	{Sign, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseSign}, "a lost sign"},
	{Repeat, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseRepeat}, "the value of the day before again"},
	{Zero, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseZero}, "a zero that is none"},
	{MissedListed, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseMissed}, "a distribution of 0.8 % left out, listed"},
	{MissedNot, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseMissed}, "a distribution of 0.8 % left out, not listed"},
	{Doubled, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseDoubled}, "a distribution of 0.8 % counted twice, listed"},
	{Split, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseSplit}, "a split left out, not listed"},
	{SplitListed, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseSplit}, "a split left out, listed"},
	{Spike, oneSeries, 2, 0, 1, []rules.Cause{rules.CauseSpike}, "a wrong price for one day, right again on the next"},
	{ShiftedFile, wholeFeed, 5, 0, 4, []rules.Cause{rules.CauseShifted}, "a file with the values of the day before, for five days"},
	{EarlyFile, wholeFeed, 5, 0, 4, []rules.Cause{rules.CauseShifted}, "a file with the values of the day after, for five days"},
	{Swapped, oneSeries, 5, 0, 4, []rules.Cause{rules.CauseSwapped}, "exchanged with a series of another group for five days"},
	{Cumulative, oneSeries, 5, 1, 4, []rules.Cause{rules.CauseCumulative}, "the return since the first of five days"},
	{ReferenceBad, oneHelper, 1, 0, 0, []rules.Cause{rules.CauseReference}, "a wrong benchmark"},
	{FXMissing, oneSeries, 5, 0, 4, []rules.Cause{rules.CauseFXMissing}, "the currency left out for five days"},
	{FXTwice, oneSeries, 5, 0, 4, []rules.Cause{rules.CauseFXTwice}, "the currency counted twice for five days"},
	{TruncatedFile, fileItself, 1, 0, 0, nil, "a file that breaks off"},
	{MissingFile, fileItself, 1, 0, 0, nil, "no file"},
	{LateFile, fileItself, 1, 0, 0, nil, "a file that comes after its deadline"},
	{Move, oneSeries, 1, 0, 0, []rules.Cause{rules.CauseGenuine, rules.CauseMarket, ""}, "a true move of 6 deviations"},
	{MoveAfter, oneSeries, 11, 10, 10, []rules.Cause{rules.CauseGenuine, rules.CauseMarket, ""},
		"a true move of 6 deviations, ten days after an x100 that nobody decided"},
}

// natureOf finds the nature of a kind; a kind that is none has the zero nature.
func natureOf(k Kind) *nature {
	i := slices.IndexFunc(natures, func(n nature) bool { return n.kind == k })
	if i < 0 {
		return &nature{}
	}
	return &natures[i]
}

// Known says whether a word is a kind.
func (k Kind) Known() bool { return natureOf(k).kind == k && k != "" }

// Story says in words what is planted.
func (k Kind) Story() string { return natureOf(k).story }

// File says that a kind takes a feed's whole file.
func (k Kind) File() bool { s := natureOf(k).scope; return s == wholeFeed || s == fileItself }

// True says that a kind is a true move, not an error.
func (k Kind) True() bool { return k == Move || k == MoveAfter }

// Lasting says that a kind shows over several days rather than on its first.
func (k Kind) Lasting() bool { return natureOf(k).days >= 5 && !k.True() }
