package ledger

import (
	"errors"
	"fmt"
)

var (
	// ErrHeld: another process has the ledger open and did not let go within the timeout.
	ErrHeld = errors.New("is held by another process: ask the running daemon, or wait for the other command to end")
	// ErrMissing: there is no file of that name.
	ErrMissing = errors.New("does not exist: strayd init makes one")
	// ErrEmpty: the file holds nothing at all.
	ErrEmpty = errors.New("is an empty file, not a ledger: restore a backup, or remove it and run strayd init")
	// ErrExists: Create found a file of that name.
	ErrExists = errors.New("already exists and is left as it is")
	// ErrFilesystem: the folder lies on a file system on which locks and memory maps are not to be trusted.
	ErrFilesystem = errors.New("a ledger needs a local disk")
	// ErrNone: there is no row of that number.
	ErrNone = errors.New("is not in the ledger")
	errDone = errors.New("the reading is closed")
)

// Damaged says where a ledger is damaged. No other error means that a backup must be restored.
type Damaged struct {
	Path  string
	Where string // bucket and key in words, "" when the whole file is meant
	Why   string
}

func (d *Damaged) Error() string {
	if d.Where == "" {
		return fmt.Sprintf("ledger %s is damaged: %s", d.Path, d.Why)
	}
	return fmt.Sprintf("ledger %s is damaged: %s: %s", d.Path, d.Where, d.Why)
}

// Newer is a ledger that a later version of the program wrote.
type Newer struct {
	Path        string
	Schema, Own uint32
}

func (n *Newer) Error() string {
	return fmt.Sprintf("ledger %s has schema %d, and this program knows schemas up to %d: use the program that wrote it, or a later one",
		n.Path, n.Schema, n.Own)
}

// Foreign is a file that is not a ledger of strayd.
type Foreign struct{ Path, Why string }

func (f *Foreign) Error() string {
	return fmt.Sprintf("%s is not a ledger of strayd: %s", f.Path, f.Why)
}

// refuse names the ledger before one of the sentences above.
func refuse(path string, err error) error { return fmt.Errorf("ledger %s %w", path, err) }
