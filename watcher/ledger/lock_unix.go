//go:build unix

package ledger

import (
	"errors"
	"io/fs"
	"os"

	"golang.org/x/sys/unix"
)

// hold takes the lock of a ledger that may be damaged, so that nobody uses it: the lock that bbolt takes. nil when there is no
// file.
func hold(path string) (*os.File, error) {
	f, err := os.Open(path)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	if err := unix.Flock(int(f.Fd()), unix.LOCK_EX|unix.LOCK_NB); err != nil {
		f.Close()
		if errors.Is(err, unix.EWOULDBLOCK) {
			return nil, refuse(path, ErrHeld)
		}
		return nil, err
	}
	return f, nil
}

// letGo unlocks and closes a file that bbolt can no longer close. Closing is not enough: its map keeps the file, and with it the
// lock, alive.
func letGo(f *os.File) error {
	return errors.Join(unix.Flock(int(f.Fd()), unix.LOCK_UN), f.Close())
}
