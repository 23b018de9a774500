package watcher

import (
	"context"
	"errors"
	"time"

	"strayd/rules"
)

// ErrChanged says that a file changed after it was found or while it was read. It waits for the next pass.
var ErrChanged = errors.New("the file changed while it was read")

// Source is what a pass needs of the place where files arrive. It only reads.
type Source interface {
	// Find lists the files of a feed: those ready to be read in the order of the dates in their names, then names; those that
	// still wait; and those that are refused unread. settled takes the person's word that nothing is being written.
	Find(f rules.Feed, now time.Time, settled bool) (Found, error)
	// Read validates a whole file and returns its content, adding names that it has not seen to names. A file that is
	// refused gives a *BadFile, one that is still being written ErrChanged.
	Read(ctx context.Context, c Candidate, f rules.Feed, names *Names, now time.Time, progress Progress) (*Sheet, error)
}

// Progress is told how much of a piece of work is done. It may be nil.
type Progress func(done, total int64)

// Candidate is a file of a feed that is there.
type Candidate struct {
	Feed     string
	Dir      string
	Name     string // base name
	Size     int64
	ModTime  time.Time
	Stamp    string     // inode, size and times, to know the file again without reading it; "" where the system has none
	Date     rules.Date // in the name, NoDate when there is none
	Sentinel bool       // its sentinel is there: the sender says that it is whole
}

// Found is what lies in a feed's folder. Each list goes by the date in the name, then the name; names without a date come first.
type Found struct {
	Ready   []Candidate
	Waiting []Waiting
	Refused []*BadFile // what must not be opened: links out of the folder, pipes, devices, folders
}

// Waiting is a file that is not ready yet, and why.
type Waiting struct {
	Candidate
	Why string
}
