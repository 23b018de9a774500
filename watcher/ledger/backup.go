package ledger

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime/debug"

	bolt "go.etcd.io/bbolt"
)

// Backup copies the ledger as of its last published step to a new file, while it is in use. The copy is verified before it gets
// its name; a file of that name is replaced.
func (l *Ledger) Backup(ctx context.Context, to string) (r Report, err error) {
	temp, err := beside(to, l.copyTo)
	if err != nil {
		return r, fmt.Errorf("backup of ledger %s: %w", l.path, err)
	}
	defer os.Remove(temp)
	if r, err = verifyFile(ctx, temp); err != nil {
		return r, fmt.Errorf("backup of ledger %s: %w", l.path, err)
	}
	return r, takeName(temp, to)
}

// copyTo writes the ledger as of its last commit.
func (l *Ledger) copyTo(f *os.File) (err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	return l.db.View(func(tx *bolt.Tx) error {
		_, err := tx.WriteTo(f)
		return err
	})
}

// beside writes a file in the folder of path under a name of its own, and brings it to the disk.
func beside(path string, write func(*os.File) error) (temp string, err error) {
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+"-*")
	if err != nil {
		return "", err
	}
	if err = write(f); err == nil {
		err = f.Sync()
	}
	if err = errors.Join(err, f.Close()); err != nil {
		err = errors.Join(err, os.Remove(f.Name()))
	}
	return f.Name(), err
}

// takeName renames a file onto path and makes that last.
func takeName(temp, path string) error {
	if err := os.Rename(temp, path); err != nil {
		return err
	}
	return syncDir(filepath.Dir(path))
}

// verifyFile verifies a ledger that is not open.
func verifyFile(ctx context.Context, path string) (r Report, err error) {
	l, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		return r, err
	}
	r, err = l.Verify(ctx, VerifyOptions{})
	return r, errors.Join(err, l.Close())
}

// Restore puts a copy of a backup in a ledger's place. The backup is verified, and the copy too, before anything changes; what
// was there before is kept beside it under the name that is returned, "" when there was nothing. ErrHeld when the ledger in
// place is in use.
func Restore(ctx context.Context, from, to string) (kept string, r Report, err error) {
	if _, err = verifyFile(ctx, from); err != nil {
		return "", r, err
	}
	old, err := hold(to)
	if err != nil {
		return "", r, err
	}
	if old != nil {
		defer old.Close()
	}
	temp, err := beside(to, func(f *os.File) error { return copyFile(f, from) })
	if err != nil {
		return "", r, err
	}
	defer os.Remove(temp)
	if r, err = verifyFile(ctx, temp); err != nil {
		return "", r, err
	}
	if old != nil {
		if kept, err = keepAside(to, ".before-restore"); err != nil {
			return "", r, err
		}
	}
	return kept, r, takeName(temp, to)
}

func copyFile(f *os.File, from string) error {
	in, err := os.Open(from)
	if err != nil {
		return err
	}
	defer in.Close()
	_, err = io.Copy(f, in)
	return err
}

// keepAside gives a file a second name that is free: path and suffix, then with a number.
func keepAside(path, suffix string) (string, error) {
	for n := 1; ; n++ {
		name := path + suffix
		if n > 1 {
			name = fmt.Sprintf("%s.%d", name, n)
		}
		err := os.Link(path, name)
		if err == nil || !errors.Is(err, fs.ErrExist) {
			return name, err
		}
	}
}
