package watcher

import (
	"slices"
	"sync"
	"time"

	"strayd/rules"
)

// judging is what all workers of one step share: the settings made ready, and what the ledger holds. It is only read, but for what
// is to be kept.
type judging struct {
	gauges  []*rules.Gauge // by the settings' order
	ids     []uint16       // the ranges' numbers in the ledger
	limits  []int          // indexes of the limit ranges
	members *rules.Membership
	odd     map[uint32]bool                     // references that are out of line themselves on the newest date: they say nothing of a file's dates
	days    func(series string) *rules.Calendar // nil when every weekday is a business day of all series

	names      *Names
	heldNames  int // names that the ledger has
	firstNames int // names that the ledger had when the pass began: later ones are in their first load
	held       []rules.Date
	newest     rules.Date // newest date of the file: flags of a first load on older dates stand as history
	file       File
	now        time.Time
	step       uint32
	settings   uint32 // number of the settings text
	nextRef    uint64
	width      int // of the widest task
	scales     *groupScales
	lone       bool                   // values of series that are weighed by nothing but their own past are weighed
	doubts     bool                   // and may be doubtful
	crew       *crew                  // the others, nil for none
	residuals  uint16                 // number in the ledger of residuals
	concluded  uint16                 // number in the ledger of what the pool concluded, 0 where it has none
	terms      uint16                 // number in the ledger of terms, 0 while no feed can have some
	weighed    *weighed               // nil where no series of the file is weighed together with others
	decided    map[valueAt]*rules.Act // decisions of this step

	decidedOn map[rules.Date][]decidedValue // of values that are judged now: of a back-run, else nil
	back      *backCount                    // of a back-run, else nil

	kept    map[keptKey]*kept // what the resident keeps; nil without one
	keeping sync.Mutex
	keptNow []keptTask // what it is to keep after this step
}

// heldBefore lists the dates before a date on which a block may hold values, ascending.
func (j *judging) heldBefore(block uint32, before rules.Date) []rules.Date {
	if int(block)*BlockSize >= j.heldNames {
		return nil
	}
	n, _ := slices.BinarySearch(j.held, before)
	return j.held[:n]
}

// heldFrom lists the dates from a date on.
func (j *judging) heldFrom(block uint32, from rules.Date) []rules.Date {
	if int(block)*BlockSize >= j.heldNames {
		return nil
	}
	n, _ := slices.BinarySearch(j.held, from)
	return j.held[n:]
}

// appliesTo says for each series whether a range judges it; nil when it judges them all.
func (j *judging) appliesTo(rangeIndex int, ids, groups []string) []bool {
	all := true
	out := make([]bool, len(ids))
	for i, id := range ids {
		out[i] = j.members.Applies(rangeIndex, id, groups[i])
		all = all && out[i]
	}
	if all {
		return nil
	}
	return out
}
