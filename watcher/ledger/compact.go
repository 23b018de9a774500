package ledger

import (
	"context"
	"errors"
	"fmt"
	"os"
	"runtime/debug"

	bolt "go.etcd.io/bbolt"
)

// Compaction says what a compaction brought, in bytes.
type Compaction struct{ Before, After int64 }

// Compact rewrites a ledger that nobody has open without its idle pages. The new file holds the same values in the same number
// with the same checksums and is verified before it takes the old one's place; the old one is kept as path.before-compact
// until the new one has been opened under its name, then removed.
func Compact(ctx context.Context, path string, o Options) (c Compaction, err error) {
	o.Mode = ReadWrite
	l, err := Open(path, o)
	if err != nil {
		return c, err
	}
	defer func() { err = errors.Join(err, l.Close()) }()
	if _, err = l.Verify(ctx, VerifyOptions{}); err != nil {
		return c, err
	}
	temp, err := l.rewrite()
	if err != nil {
		return c, fmt.Errorf("compact of ledger %s: %w", path, err)
	}
	defer os.Remove(temp)
	if err = l.sameAs(ctx, temp); err != nil {
		return c, err
	}
	if c.Before, c.After, err = sizes(path, temp); err != nil {
		return c, err
	}
	kept, err := keepAside(path, ".before-compact")
	if err != nil {
		return c, err
	}
	if err = takeName(temp, path); err != nil {
		return c, err
	}
	if err = opens(path); err != nil {
		return c, fmt.Errorf("%w; the ledger as it was is in %s", err, kept)
	}
	return c, os.Remove(kept)
}

// opens says whether a ledger opens for reading.
func opens(path string) error {
	l, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		return err
	}
	return l.Close()
}

func sizes(paths ...string) (before, after int64, err error) {
	for _, p := range paths {
		info, err := os.Stat(p)
		if err != nil {
			return 0, 0, err
		}
		before, after = after, info.Size()
	}
	return before, after, nil
}

// rewrite copies every value into a new file beside the ledger.
func (l *Ledger) rewrite() (temp string, err error) {
	temp, err = beside(l.path, func(*os.File) error { return nil })
	if err != nil {
		return "", err
	}
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	db, err := bolt.Open(temp, 0o600, &bolt.Options{FreelistType: bolt.FreelistMapType, NoStatistics: true})
	if err != nil {
		return temp, err
	}
	db.AllocSize = 0 // no more room than is needed
	return temp, errors.Join(bolt.Compact(db, l.db, commitSize), db.Close())
}

// sameAs verifies another file and compares what it holds.
func (l *Ledger) sameAs(ctx context.Context, path string) (err error) {
	other, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, other.Close()) }()
	if _, err := other.Verify(ctx, VerifyOptions{}); err != nil {
		return err
	}
	own, err := l.totals()
	theirs, otherErr := other.totals()
	if err = errors.Join(err, otherErr); err == nil && own != theirs {
		err = &Damaged{Path: path, Why: "it does not hold the same values as the ledger that it was made from"}
	}
	return err
}

func (l *Ledger) totals() (t totals, err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	err = l.db.View(func(tx *bolt.Tx) (err error) {
		t, err = readTotals(tx.Bucket(inMeta.name()))
		return err
	})
	return t, err
}
