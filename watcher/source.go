package watcher

import (
	"time"

	"strayd/rules"
)

// Source is what a pass needs of the place where files arrive. It only reads.
type Source interface {
	// Find lists the files of a feed: those ready to be read in the order of the dates in their names, then names; those that
	// still wait; and those that are refused unread. settled takes the person's word that nothing is being written.
	Find(f rules.Feed, now time.Time, settled bool) (Found, error)
	// Hash is the SHA-256 of a file's bytes as they lie on disk.
	Hash(c Candidate) ([32]byte, error)
	// Read validates a whole file and returns its content, adding names that it has not seen to names. A file that is
	// refused gives a *BadFile.
	Read(c Candidate, f rules.Feed, names *Names, now time.Time, progress Progress) (*Sheet, error)
}

// Progress is told how much of a piece of work is done. It may be nil.
type Progress func(done, total int64)

// Candidate is a file that may be read.
type Candidate struct {
	Dir   string
	Name  string // base name
	Size  int64
	Stamp string // inode, size and times
}

// Found is what lies in a feed's folder.
type Found struct {
	Ready   []Candidate
	Waiting []Waiting
	Refused []*BadFile
}

// Waiting is a file that is not read yet, and why.
type Waiting struct{ Name, Why string }
