package ledger

import (
	"bytes"
	"context"
	"encoding/hex"
	"errors"
	"fmt"

	"strayd/rules"
	"strayd/watcher"
)

// VerifyOptions of Verify; the zero value checks all that the ledger can check by itself.
type VerifyOptions struct {
	// Head is a hash of the record that was noted before, in hexadecimal: it must be the newest or occur in the chain.
	Head string
	// Progress is told how many of the published values are checked.
	Progress func(done, total int64)
	// Recheck recomputes what is judged, such as rolling states and used values, and says the first that differs.
	Recheck func(watcher.View) error
}

// Report is what a verification that found nothing wrong went through.
type Report struct {
	Step     uint32
	Names    uint32
	Values   int64  // whose checksum was checked
	Staged   int64  // of them, not published
	Records  uint64 // entries of the record
	Head     string // hash of the newest, "" when there is none
	HeadSeen uint64 // entry that has the head asked for
}

// verifier holds what the walk over all values gathers to compare in the end.
type verifier struct {
	ctx     context.Context
	v       *View
	o       VerifyOptions
	report  Report
	expect  totals
	seen    totals
	total   int64
	newest  []byte // last key without its step, of a bucket that keeps only the newest layer
	chain   [32]byte
	flagged int64                   // flags that must stand in the index by series
	open    int64                   // flags that must stand in the index of open ones
	acts    map[uint32]*rules.Entry // what the record says that people did, by step
	actedAt uint32                  // the step of the newest of them
	toMeet  uint64                  // rows of flags that the record tells of
	met     uint64                  // those that were found
}

// Verify checks a whole ledger: every checksum and every value's form, that indexes and rows agree, that nothing vanished, the
// chain of the record, and bbolt's own pages. The error names the first place that is wrong; errors other than *Damaged say
// that the check could not be made, or that the head asked for does not occur.
func (l *Ledger) Verify(ctx context.Context, o VerifyOptions) (r Report, err error) {
	v, err := l.Read()
	if err != nil {
		return r, err
	}
	defer func() {
		if closeErr := v.Close(); err == nil {
			err = closeErr
		}
	}()
	c := &verifier{ctx: ctx, v: v, o: o, acts: map[uint32]*rules.Entry{}}
	if err := c.all(); err != nil {
		return c.report, err
	}
	if o.Recheck == nil {
		return c.report, nil
	}
	return c.report, o.Recheck(v)
}

func (c *verifier) all() (err error) {
	defer c.v.leave(c.v.enter(&err), &err)
	if err != nil {
		return err
	}
	if err := c.pages(); err != nil {
		return err
	}
	if c.expect, err = readTotals(c.v.buckets[inMeta]); err != nil {
		return err
	}
	for _, t := range c.expect {
		c.total += int64(t.count)
	}
	for b := range buckets {
		if err := c.bucket(b); err != nil {
			return err
		}
	}
	if c.o.Progress != nil {
		c.o.Progress(c.total, c.total)
	}
	for _, check := range []func() error{c.counts, c.headSeen} {
		if err := check(); err != nil {
			return err
		}
	}
	return nil
}

// bucket walks every value of a bucket.
func (c *verifier) bucket(in bucket) error {
	c.newest = nil
	cursor := c.v.buckets[in].Cursor()
	var last []byte
	for k, value := cursor.First(); k != nil; k, value = cursor.Next() {
		if bytes.Compare(last, k) >= 0 {
			return malformed(in, k, "its key is not after the one before")
		}
		last = k
		body, err := checked(in, k, value)
		if err != nil {
			return err
		}
		if err := c.step(in, k, value); err != nil {
			return err
		}
		if !published(in, k, c.v.head) {
			c.report.Staged++
			continue
		}
		if err := c.value(in, k, body); err != nil {
			return err
		}
	}
	if in != inMeta && c.seen[in] != c.expect[in] {
		return &Damaged{Where: in.String(), Why: fmt.Sprintf("%d values are there and %d should be, or one of them is not the one that should be",
			c.seen[in].count, c.expect[in].count)}
	}
	return nil
}

// step counts a value, reports progress and looks whether to go on.
func (c *verifier) step(in bucket, key, value []byte) error {
	if in != inMeta && published(in, key, c.v.head) {
		c.seen[in].add(sealOf(value))
	}
	c.report.Values++
	if c.report.Values%1024 != 0 {
		return nil
	}
	if c.o.Progress != nil {
		c.o.Progress(min(c.report.Values, c.total), c.total)
	}
	return c.ctx.Err()
}

// counts compares what was met with what the head says.
func (c *verifier) counts() error {
	h := c.v.head
	c.report.Step, c.report.Names, c.report.Records = h.step, h.names, h.records
	c.report.Head, _ = c.v.Head()
	for _, n := range []struct {
		in        bucket
		got, want uint64
	}{
		{inPasses, c.seen[inPasses].count, uint64(h.passes)},
		{inSettings, c.seen[inSettings].count, uint64(h.settings)},
		{inRecord, c.seen[inRecord].count, h.records},
		{inNames, c.seen[inNames].count, (uint64(h.names) + watcher.BlockSize - 1) / watcher.BlockSize},
		{inFlagAt, c.seen[inFlagAt].count, uint64(c.flagged)},
		{inOpen, c.seen[inOpen].count, uint64(c.open)},
		{inOutbox, c.seen[inOutbox].count, h.notices},
		{inOutboxKey, c.seen[inOutboxKey].count, h.notices},
		{inFlags, c.met, c.toMeet},
	} {
		if n.got != n.want {
			return &Damaged{Where: n.in.String(), Why: fmt.Sprintf("%d values are there, and the rest of the ledger says %d", n.got, n.want)}
		}
	}
	if c.chain != h.chain {
		return &Damaged{Where: "record", Why: fmt.Sprintf("its last entry has hash %x, and the head says %x", c.chain, h.chain)}
	}
	return nil
}

// headSeen looks for the head that was asked for.
func (c *verifier) headSeen() error {
	if c.o.Head == "" || c.report.HeadSeen > 0 {
		return nil
	}
	if _, err := hex.DecodeString(c.o.Head); err != nil || len(c.o.Head) != 64 {
		return fmt.Errorf("head %q is not a hash of 64 hexadecimal digits", c.o.Head)
	}
	return &Damaged{Where: "record", Why: fmt.Sprintf("no entry has hash %s: its end was cut off, or the hash is of another ledger", c.o.Head)}
}

// pages checks the pages, first with plain reads, so that bbolt's own check, on a goroutine of its own, meets neither a fault
// nor a circle. Nothing is written meanwhile: the list of free pages is always that of the last commit.
func (c *verifier) pages() error {
	c.v.l.mu.Lock()
	defer c.v.l.mu.Unlock()
	if err := checkPages(c.v.l.file, nil); err != nil {
		return err
	}
	tx, err := c.v.l.db.Begin(false)
	if err != nil {
		return err
	}
	var first error
	for err := range tx.Check() {
		if first == nil {
			first = &Damaged{Why: fmt.Sprintf("its pages are in disorder: %v", err)}
		}
	}
	return errors.Join(first, tx.Rollback())
}
