package health

import (
	"time"

	"strayd/rules"
)

// Report is how the daemon is at one moment. Names are unique within each list. It holds no secret.
type Report struct {
	Version  string
	Started  time.Time
	Now      time.Time
	Beat     time.Time // last sign of life of the loop
	Stopping bool

	Ledger        Ledger
	Configuration Configuration
	Jobs          []Job
	Channels      []Channel
	Feeds         []Feed
	Pass          Pass               // the last one; Number 0 when there was none
	OpenFlags     map[rules.Kind]int // those that still ask something of a person
	ClockSteps    int
}

// Ledger is how the store is.
type Ledger struct {
	Open   bool
	Path   string
	Step   uint64 // newest
	Bytes  int64  // size of its file
	Series int
}

// Configuration is the one in force, and how the last reload went.
type Configuration struct {
	Valid   bool
	Hash    string
	Error   string // of the last reload, "" when it was taken; while there is one, the configuration before it is in force
	ErrorAt time.Time
}

// Job is how a job of the schedule is. Counts are since the start.
type Job struct {
	Name      string
	LastSlot  time.Time
	Outcome   string // of the last run
	Error     string // of the last run
	NextSlot  time.Time
	Every     time.Duration // the shorter of the gaps before and after NextSlot; 0 when not known, and then it is never overdue
	Running   time.Time     // since when; zero when it does not run
	Runs      int
	Failed    int
	Panics    int
	Missed    int
	Coalesced int
}

// ChannelState is whether a channel delivers.
type ChannelState string

const (
	ChannelOK      ChannelState = "ok"
	ChannelWaiting ChannelState = "waiting" // it will try again later
	ChannelDead    ChannelState = "dead"    // it does not try again by itself
)

// Channel is how a channel is.
type Channel struct {
	Name    string
	State   ChannelState
	Reason  string // class of the error that it waits for or died of
	Waiting int    // notices
	Failed  int    // notices that failed for good
	// Oldest is when the oldest waiting notice could first have gone: when it was made or, when the channel's hours held it, when
	// these began; zero when none could go yet.
	Oldest time.Time
	Error  string // class of the last error

	Fallback string // the channel that has taken over, "" for none
}

// Feed is the last accepted file of a feed.
type Feed struct {
	Name string
	File string
	Date rules.Date
	At   time.Time // when it was accepted; zero when none was
}

// Pass is what a pass did.
type Pass struct {
	Number   uint32
	Started  time.Time
	Ended    time.Time
	Error    string // why it could not go on
	Accepted int    // files, like the next two
	Refused  int
	Waiting  int
	Verdicts map[rules.Finding]int
	Flags    map[rules.Kind]int
}
