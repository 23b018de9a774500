package rules

import "time"

// NoticeState is where a notice is on its way.
type NoticeState string

// The states, in the order of their numbers in the ledger: only append.
const (
	NoticeWaiting NoticeState = "waiting" // to be sent, not before Next
	NoticeSending NoticeState = "sending" // handed to the channel, outcome not yet recorded
	NoticeSent    NoticeState = "sent"
	NoticeFailed  NoticeState = "failed" // for good; a person may send it again
	// NoticeWithdrawn was never sent: what it told of became history before it left.
	NoticeWithdrawn NoticeState = "withdrawn"
)

// NoticeStates lists every state in order.
var NoticeStates = []NoticeState{NoticeWaiting, NoticeSending, NoticeSent, NoticeFailed, NoticeWithdrawn}

// The kinds of notice beside those of a flag.
const (
	KindDigest Kind = "digest" // many flags of one step in one message
	KindDaily  Kind = "daily"  // the line that says all was checked
	KindTest   Kind = "test"
	KindUpdate Kind = "update" // what somebody did about flags that were told of before
	KindNotice Kind = "word"   // a word about the program itself: a channel that died, a pass that failed
	KindWeekly Kind = "weekly"

	KindReopened   Kind = "reopened"   // flags that were settled and ask again
	KindEscalation Kind = "escalation" // flags that nobody has answered, or that still hold a release back
)

// Follows says that a notice of this kind goes with the one that told of its flags before.
func (k Kind) Follows() bool { return k == KindUpdate || k == KindReopened || k == KindEscalation }

// Notice is one message to one channel. It is written with the flags that it tells of, in the same step.
type Notice struct {
	Number  uint64 // in the outbox, from 1; given by the ledger
	Key     string // the same key is never enqueued twice
	Channel string
	Kind    Kind
	Refs    []uint64 // the flags it tells of
	Date    Date     // valuation date, NoDate when it is about none
	Made    time.Time
	Lines   []string // plain text, the first line complete alone; unescaped: channels escape

	State    NoticeState
	Attempts int
	Next     time.Time // not to be sent before
	Started  time.Time // of the last attempt
	Ended    time.Time // sent, or failed for good; of one put back by a person, when that was
	Receipt  string    // what the channel gave back, such as a message's id
	Error    string    // of the last attempt, without secrets
	Repeat   bool      // an earlier attempt may have got through
	Answers  uint64    `json:",omitempty"` // of one that follows: the notice to the same channel that told of its flags; given by the ledger
	Under    string    `json:"-"`          // the receipt of that one, when this one is handed out

	For  string `json:",omitzero"` // the channel it was made for, where Channel stands in for that one
	Told string `json:",omitzero"` // the fallback channel that is told of the same by a notice of its own
}

// News is what one step has to tell.
type News struct {
	At     time.Time
	Feed   string
	File   string
	Rows   int // rows of the file
	Series int // series that it has values of on its newest date
	Flags  []FlagNews

	Reopened []Flag // raised before, settled, and open again
}

// FlagNews is a flag that asks something, with what its message says beyond the flag itself.
type FlagNews struct {
	Flag
	Window   int   // observations behind the range, 0 where it has none
	WindowTo Date  // newest of them
	Used     Units // what the window takes meanwhile, Missing when left out
	Market   *MarketNews
	Gated    bool // a file refused by what is held: a person may release it
	Covered  bool // the notice of a market day of the same news tells of it
}

// MarketNews is what the message of a market day says beyond its flag, whose return is the median of the group.
type MarketNews struct {
	Reporting int      // series with a value
	MedianZ   float64  // of their distances from their own past, in deviations
	NotMoved  []string // series that did not take part, and stayed near their usual size
	Otherwise []string // series that did not take part, and moved far in their own way
}

// DayNews is what the daily line says.
type DayNews struct {
	At         time.Time
	Date       Date // the valuation date that the day's files were about
	Checked    int  // series with a value on the date
	Expected   int  // series that were expected
	Files      int  // files accepted today
	Feeds      int  // feeds whole, of
	FeedsDue   int  // those expected
	Refused    int
	Breaches   int
	Limits     int
	Restated   int
	Missing    []string // series without a value, at most a few
	Open       int      // flags that ask something
	OldestDays int      // business days since the oldest of them was raised
	OldestRef  uint64
	Head       string   // of the hash-chained record
	Dead       []string // channels that do not deliver, with the reason
}

// ActNews is what somebody did about flags.
type ActNews struct {
	Act
	Flags []Flag // as they stand now
}
