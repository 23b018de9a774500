//go:build !unix

package ledger

import (
	"errors"
	"io/fs"
	"os"
)

// hold only opens the file: on this system a ledger in use cannot be replaced anyway. nil when there is no file.
func hold(path string) (*os.File, error) {
	f, err := os.Open(path)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	return f, err
}

// letGo closes a file that bbolt can no longer close.
func letGo(f *os.File) error { return f.Close() }
