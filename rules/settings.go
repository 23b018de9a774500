package rules

import "time"

// Feed is how one regular file is found and read. Nothing about a file is guessed: all of it is declared here.
type Feed struct {
	Name      string
	Dir       string // absolute folder of the files
	Pattern   string // name pattern (path.Match) within Dir
	Schedule  string // cron text, checked
	Due       *Due
	Layout    Layout
	Columns   Columns
	Value     ValueKind
	Unit      Unit
	DateStyle string // YYYY-MM-DD and the like: tokens YYYY YY MM DD MMM, or excel for serial days
	Decimal   byte   // '.' or ','
	Separator byte   // ',' ';' '\t' '|'
	Sheet     string // of a spreadsheet; "" for its only one
	Encoding  string // utf-8, utf-16, latin-1
	Missing   []string
	Settle    time.Duration
	Sentinel  string  // such as ".done"; "" for none
	SkipShare float64 // greatest share of bad rows that are skipped; 0 refuses the file on the first
}

// Due is when a feed must be whole: at a time of day, a number of business days after the valuation date.
type Due struct {
	Minutes  int // of the day
	Days     int
	Timezone string
	Calendar *Calendar // of the business days; nil for Monday to Friday
}

// Columns names the columns of a long file, or the date column of a wide one.
type Columns struct {
	Date, Series, Value string
	Status, Days        string // "" when the file has none
}

// Layout is the shape of a file.
type Layout string

// ValueKind says what the value column holds.
type ValueKind string

// Unit says what a value of 1 in the file means.
type Unit string

const (
	Long Layout = "long" // one row an observation
	Wide Layout = "wide" // one row a date, one column a series

	OfReturn ValueKind = "return"
	OfPrice  ValueKind = "price" // turned into simple returns, the prices kept

	Fraction Unit = "fraction"
	Percent  Unit = "percent"
	BP       Unit = "bp"
)

// Decimals is how far the decimal point of a value moves to become a fraction.
func (u Unit) Decimals() int {
	switch u {
	case Percent:
		return 2
	case BP:
		return 4
	}
	return 0
}

// Group is a set of series judged together.
type Group struct {
	Name      string
	Series    []string // ids or globs (path.Match); empty: only the register fills it
	Reference string   // a series, "peers", or "none"
	Owner     string
	Reply     time.Duration
	Release   *Due
	Escalate  []string `json:",omitempty"` // channels, those that take a flag when empty
	FourEyes  bool

	Materiality float64 // size of an error, as a fraction of the NAV, from which the house's rules call it material; 0 for none
}

// Basis is what a range judges.
type Basis string

// Scale is how a range estimates centre and deviation.
type Scale string

// Side is which of the two tails a range looks at.
type Side string

// Pending is how a flagged value enters the window until someone decides.
type Pending string

const (
	Return   Basis = "return"
	Residual Basis = "residual"

	Plain    Scale = "plain"    // mean and deviation (divisor n-1) of the window
	Weighted Scale = "weighted" // zero mean, exponentially weighted mean square
	MAD      Scale = "mad"      // median and 1.4826 times the median absolute deviation

	Both  Side = "both"
	Lower Side = "lower"
	Upper Side = "upper"

	Clip     Pending = "clip"
	Keep     Pending = "keep"
	LeaveOut Pending = "leave-out"
)

// Auto is the name of the tail that is learnt.
const Auto = "auto"

// TailModel is the distribution that turns a z-score into a tail probability.
type TailModel struct {
	Name string  // normal, t, auto, predictive-t, rank
	DF   float64 // degrees of freedom of a scaled t; 5 for t5
}

// Line is where watch or breach begins. Exactly one of the fields is set.
type Line struct {
	Tail       float64 // tail probability, a fraction
	Confidence float64 // share expected inside, a fraction
	Z          float64 // deviations
	Budget     float64 // flags a week, over all series and ranges
	Level      float64 // the tail probability that a budget was turned into; fixed in the record
}

// Range is one expected range, or a limit when Limit is set.
type Range struct {
	Name       string
	Of         Basis
	For        []string // groups, ids or globs; empty for all
	Window     int
	Scale      Scale
	Decay      float64
	Tail       TailModel
	Predictive bool
	Side       Side
	Watch      Line
	Breach     Line
	Pending    Pending
	Limit      *Limit
}

// Limit is a pair of lines set by a person or a mandate.
type Limit struct{ Low, High Units }

// Channel is where notices go.
type Channel struct {
	Name   string
	Kind   string // slack, webhook, mail, console
	Target string // slack: the channel's id; webhook: the address
	Mail   *Mail  // mail only
	For    []string
	Kinds  []Kind
	From   int // minutes of the day; From == To for always
	To     int
	Short  bool

	Fallback string        // the channel that takes over when this one delivers nothing, "" for none
	After    time.Duration // how long it delivers nothing before that
}

// Mail is by which server, from whom and to whom a channel sends mail.
type Mail struct {
	Server   string // host:port
	Security string // starttls, implicit, none
	From     string
	To       []string
}

// Series is one row of the register: what is known of a series beyond its name.
type Series struct {
	ID, Name, Group, Reference, FX, Calendar, Owner string
	Start, End                                      Date // NoDate when open
}

// Event is one row of the events file.
type Event struct {
	Date   Date
	Series string
	Kind   string // distribution, split
	Amount float64
}
