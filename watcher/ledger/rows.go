package ledger

import (
	"bytes"
	"fmt"

	bolt "go.etcd.io/bbolt"

	"strayd/watcher"
)

// newest finds the last layer of a key up to a step: key (a copy) and value, or nil.
func newest(c *bolt.Cursor, prefix []byte, step uint32) (key, value []byte) {
	for k, v := c.Seek(prefix); k != nil && bytes.HasPrefix(k, prefix) && len(k) == len(prefix)+4; k, v = c.Next() {
		if stepOf(k) > step {
			break
		}
		key, value = k, v
	}
	return bytes.Clone(key), value
}

// rowCursor finds the newest layers of keys that are asked for in ascending order: those that lie close together without a new descent.
type rowCursor struct {
	c    *bolt.Cursor
	k, v []byte // the first that was not looked at; nil before the first question
}

// nearby is how many keys are stepped over before a descent is cheaper.
const nearby = 4

// newest is as the function of this name.
func (r *rowCursor) newest(prefix []byte, step uint32) (key, value []byte) {
	for n := 0; r.k != nil && n < nearby && bytes.Compare(r.k, prefix) < 0; n++ {
		r.k, r.v = r.c.Next()
	}
	if r.k == nil || bytes.Compare(r.k, prefix) < 0 {
		r.k, r.v = r.c.Seek(prefix)
	}
	for ; r.k != nil && bytes.HasPrefix(r.k, prefix) && len(r.k) == len(prefix)+4; r.k, r.v = r.c.Next() {
		if stepOf(r.k) <= step {
			key, value = r.k, r.v
		}
	}
	return key, value
}

// rows puts what is written only when the batch is published.
func (w *writer) rows(p *plan) error {
	for _, f := range p.flags {
		if err := w.openFlag(f); err != nil {
			return err
		}
	}
	for _, r := range p.batch.NewRanges {
		key := put16(nil, r.ID)
		if w.buckets[inRanges].Get(key) != nil {
			return fmt.Errorf("range number %d is taken", r.ID)
		}
		if err := w.put(inRanges, key, func(dst []byte) []byte { return append(dst, r.Key...) }); err != nil {
			return err
		}
	}
	if err := w.fileRow(p); err != nil {
		return err
	}
	if p.batch.Settings != nil {
		w.head.settings++
		key := put32(nil, w.head.settings)
		if err := w.put(inSettings, key, func(dst []byte) []byte { return append(dst, p.batch.Settings...) }); err != nil {
			return err
		}
	}
	for _, r := range p.batch.Record {
		if err := w.entry(r); err != nil {
			return err
		}
	}
	if err := w.withdraw(p.batch.Withdraw); err != nil {
		return err
	}
	return w.enqueue(p.batch.Notices)
}

func (w *writer) openFlag(f *watcher.FlagRow) error {
	key := put64(nil, f.Ref)
	if !f.Unfinished() {
		return w.remove(inOpen, key)
	}
	return w.replace(inOpen, key, func(dst []byte) []byte { return dst })
}

func (w *writer) fileRow(p *plan) error {
	f := p.batch.File
	if f.Outcome == "" {
		return nil
	}
	if indexOf(outcomes(), f.Outcome) == notListed {
		return fmt.Errorf("outcome %q of file %s is not known", f.Outcome, f.File.Name)
	}
	step := put32(nil, p.batch.Step)
	if err := w.put(inFiles, step, func(dst []byte) []byte { return packFile(dst, &f) }); err != nil {
		return err
	}
	if f.Fileless() { // there is no file to find again
		return nil
	}
	return w.replace(inFileAt, fileDigest(f.File.Feed, f.File.SHA256, f.FeedKey), func(dst []byte) []byte { return append(dst, step...) })
}

// entry adds one entry to the chain.
func (w *writer) entry(r watcher.RecordEntry) error {
	w.head.records++
	e := Entry{Number: w.head.records, RecordEntry: r, Prev: w.head.chain}
	e.Hash = e.link()
	w.head.chain = e.Hash
	return w.put(inRecord, put64(nil, e.Number), func(dst []byte) []byte { return packEntry(dst, &e) })
}

// EndPass adds one row to the run record and gives it the next number, whatever number it has.
func (l *Ledger) EndPass(r watcher.PassRow) error {
	return l.write(nil, func(w *writer) error {
		w.head.passes++
		return w.put(inPasses, put32(nil, w.head.passes), func(dst []byte) []byte { return packPass(dst, &r) })
	})
}
