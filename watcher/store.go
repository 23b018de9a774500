package watcher

import (
	"strings"
	"time"

	"strayd/rules"
)

// Store is what a pass needs of the ledger.
type Store interface {
	// View opens a consistent reading as of the last published step. Several may be open at once, each for one goroutine.
	View() (View, error)
	// Publish writes a batch as one visible step: readers see all of it or nothing, whatever happens in between.
	Publish(*Batch) error
	// EndPass adds one row to the run record and gives it the next number.
	EndPass(PassRow) error
}

// FlagHead is what is quickly told of a flag that is held.
type FlagHead struct {
	Kind     rules.Kind
	Standing rules.Standing
	Step     uint32 // that raised it
	Date     rules.Date
	SeriesID uint32 // or NoSeries
}

// View is a reading of the ledger at one step. Close it before publishing.
type View interface {
	Close() error
	Step() uint32 // the last published step, 0 in a new ledger
	// AsOf is the same reading as of an earlier step. It ends with the reading that it is of; only returns, used values and flags of
	// then can be asked of it.
	AsOf(step uint32) View
	NextRef() uint64        // the ref that the next flag gets
	Names() (*Names, error) // to read only; Copy what you add to
	// Dates lists the dates on which anything is held, ascending.
	Dates(What) ([]rules.Date, error)
	// Fill writes the newest values of one date for the series Block*BlockSize+from+i into dst (see Column.Fill) and says
	// whether anything is held there. Nothing is written when it is not.
	Fill(w What, date rules.Date, block uint32, from int, dst []int64) (bool, error)
	// Patch overwrites, in dst filled as above with returns, the cells whose used value under a range differs from the
	// return: with the used value, or with Missing64 where the value is left out.
	Patch(rangeID uint16, date rules.Date, block uint32, from int, dst []int64) error
	// Marked lists the flagged cells of one date and block, by offset.
	Marked(date rules.Date, block uint32) ([]int, error)
	// Layers calls each with every layer of one date and block, oldest first: the step that wrote it and its cells, Missing64
	// where it has none. The cells are valid in the call only.
	Layers(w What, date rules.Date, block uint32, each func(step uint32, vals []int64) error) error
	// Series gives every version of every date of one series, by date, then step.
	Series(w What, id uint32) ([]Version, error)
	// Used gives every used value that differs from the return, by date, then step.
	Used(rangeID uint16, id uint32) ([]Version, error)
	// State is the newest stored state of a range for one block.
	State(rangeID uint16, block uint32) (*State, error)
	// FileSeen finds how a file of this content fared under the same feed settings before.
	FileSeen(feed string, sha [32]byte, feedKey string) (FileRow, bool, error)
	// File is the file row of a step.
	File(step uint32) (FileRow, error)
	// Files calls each with every file row by step, until it returns false.
	Files(each func(FileRow) bool) error
	// LastPass is the newest row of the run record; ok is false when there is none.
	LastPass() (row PassRow, ok bool, err error)
	// Head is the hash of the newest entry of the hash-chained record, in hex; "" when the record is empty.
	Head() (string, error)
	// Ranges lists the numbered range definitions.
	Ranges() ([]RangeKey, error)
	// GroupScales gives the group deviations that provisional verdicts of a group used, by date, then step.
	GroupScales(rangeID uint16, group string) ([]GroupScale, error)
	// Settings is the settings text of a number, from 1; LastSettings is the newest number, 0 in a new ledger.
	Settings(id uint32) ([]byte, error)
	LastSettings() (uint32, error)
	// FlagAt finds the flag of a series, date and kind.
	FlagAt(series uint32, date rules.Date, kind rules.Kind) (rules.Flag, bool, error)
	// Flag finds a flag by its ref.
	Flag(ref uint64) (rules.Flag, bool, error)
	// FlagPast is a flag as it stood after each step that changed it, oldest first.
	FlagPast(ref uint64) ([]FlagVersion, error)
	// Flags calls each with every flag (or only with those that are unfinished, see rules.Flag) by ref, until it returns false.
	Flags(all bool, each func(rules.Flag) bool) error
	// FlagsOf is Flags for those only that takes is true of; the others are not read whole.
	FlagsOf(all bool, takes func(FlagHead) bool, each func(rules.Flag) bool) error
}

// FlagVersion is a flag as it stood from a step on.
type FlagVersion struct {
	Step uint32
	rules.Flag
}

// Version is one value of one date, as known from a step on. In a list of used values, Missing64 means left out, and
// Missing32 cannot occur.
type Version struct {
	Date  rules.Date
	Step  uint32
	Value int64
	Line  uint32
}

// Batch is everything that one file changes. The ledger numbers it with the step after the view's.
type Batch struct {
	Step      uint32 // view.Step()+1
	File      FileRow
	NewNames  [][]byte // in the order of their numbers, continuing those held
	Returns   []*Column
	Prices    []*Column
	Used      []UsedColumn
	States    []State
	Scales    []GroupScale
	NewRanges []RangeKey
	Settings  []byte // new settings text, nil when unchanged; the ledger gives it the next number
	Record    []RecordEntry
	Flags     []*FlagRow
	Notices   []rules.Notice // of this step's flags; one whose key is there already is passed over
	Withdraw  []uint64       // flags that ask nothing any more: a waiting notice of these alone is not sent
	Spend     bool           // nobody needs the cells of the columns any more: a Store may let go of each once it is written
}

// UsedColumn holds the cells of one date and block whose used value under a range differs from the return.
type UsedColumn struct {
	Range   uint16
	Date    rules.Date
	Block   uint32
	Offsets []uint16 // ascending
	Values  []int64  // units; Missing64 where the value is left out; the return itself where an earlier patch is withdrawn
}

// State is the exact rolling state of one range for one block of series, after everything up to and including a date.
type State struct {
	Range uint16
	Block uint32
	Step  uint32
	Upto  rules.Date
	N     []uint32     // used observations in the window (weighted: since the start)
	Last  []rules.Date // newest used observation, NoDate when none
	Sum   []Int128     // of the used values in the window
	Sq    []Int128     // of their squares, unsigned
	Var   []float64    // weighted only: the mean square in fractions squared
}

// Int128 is a two's complement integer of 128 bits.
type Int128 struct{ Hi, Lo uint64 }

// RangeKey gives a range's definition its number.
type RangeKey struct {
	ID  uint16
	Key string
}

// GroupScale is the deviation that a group lends to its provisional series on a date.
type GroupScale struct {
	Range     uint16
	Group     string
	Date      rules.Date
	Step      uint32
	Deviation float64
	Series    uint32 // how many series it is the median of
}

// The kinds of entry in the record.
const (
	SettingsEntry = "settings"
	DecisionEntry = "decision" // its body is that of a rules.Entry
)

// RecordEntry is one line of the hash-chained record.
type RecordEntry struct {
	Kind string // SettingsEntry, DecisionEntry
	Who  string // uid and name of who acted
	At   time.Time
	Body []byte // JSON
}

// FlagRow is a flag with its series number. New is false when it replaces the flag of the same ref.
type FlagRow struct {
	rules.Flag
	SeriesID uint32 // NoSeries when the flag is not about one series
	New      bool

	// Of a first load: an open one becomes history once a newer date comes in within the same pass. Not stored.
	First bool

	// Settled until this step, which opens it again. Not stored.
	Reopens bool

	// For the message only; not stored.
	Market   *rules.MarketNews
	Window   int         // observations behind the range
	WindowTo rules.Date  // newest of them
	Used     rules.Units // what the window takes meanwhile
}

// NoSeries is the series number of a flag that is not about one series.
const NoSeries uint32 = 1<<32 - 1

// FileRow is what became of one file.
type FileRow struct {
	Step     uint32
	File     File
	Stamp    string // inode, size and times of the file when it was read, to know it again without reading
	FeedKey  string // hash of the feed's settings
	Settings uint32
	Outcome  Outcome
	Received time.Time
	Reason   string // of a refusal: place and message; of an accepted file unended, where its last line has no newline
	Line     uint32
	First    rules.Date
	Last     rules.Date
	Counts   Counts
}

// Outcome says what became of a file.
type Outcome string

const (
	Accepted Outcome = "accepted"
	Refused  Outcome = "refused"
	// Changed is the outcome of a step that holds no file: the settings changed.
	Changed Outcome = "settings changed"
	// Overdue is the outcome of a step that holds no file: a feed was not whole by its deadline.
	Overdue Outcome = "overdue"
	// Acted is the outcome of a step that holds no file: a person did something about flags.
	Acted Outcome = "acted"
	// Lapsed is the outcome of a step that holds no file: waivers ran out.
	Lapsed Outcome = "waivers ended"
	// Checked is the outcome of a step that holds no file: the slow-burn checks of a week, whose dates are First to Last, were made.
	Checked Outcome = "week checked"
)

// Fileless says that the row's step was made by no file.
func (r *FileRow) Fileless() bool { return r.Outcome != Accepted && r.Outcome != Refused }

// Gated says that the file was refused by what is held, not by its form: a person may release it. Its key is that of gateKey.
func (r *FileRow) Gated() bool { return r.Outcome == Refused && strings.Contains(r.FeedKey, gateMark) }

// Counts are the figures of a file or a pass.
type Counts struct {
	Rows, New, Late, Restated, Same         int
	Inside, Watch, Breach, NotJudged, Flags int // verdicts over all ranges but limits; flags raised
	Provisional                             int
}

// Add sums two counts.
func (c *Counts) Add(o Counts) {
	c.Rows += o.Rows
	c.New += o.New
	c.Late += o.Late
	c.Restated += o.Restated
	c.Same += o.Same
	c.Inside += o.Inside
	c.Watch += o.Watch
	c.Breach += o.Breach
	c.NotJudged += o.NotJudged
	c.Flags += o.Flags
	c.Provisional += o.Provisional
}

// PassRow is one line of the run record.
type PassRow struct {
	Number   uint32
	Started  time.Time
	Ended    time.Time
	Feed     string // "" for all
	Accepted int
	Refused  int
	Waiting  int
	Counts   Counts
	Failed   string // why the pass failed, "" when it did not
	Program  string // version of the program
}
