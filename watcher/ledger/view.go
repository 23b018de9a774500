package ledger

import (
	"fmt"
	"runtime/debug"

	bolt "go.etcd.io/bbolt"

	"strayd/watcher"
)

// View is a reading of the ledger as of the last published step: a watcher.View, and what only commands need. It may pass
// from one goroutine to another, but serves one at a time.
type View struct {
	l       *Ledger
	tx      *bolt.Tx
	buckets [buckets]*bolt.Bucket
	cursors [buckets]*bolt.Cursor
	head    head
	whole   uint32              // the last published step, which names are read as of
	chunks  map[uint32]namePart // names looked up one by one
	file    watcher.FileRow     // the last one that a flag referred to
}

var (
	_ watcher.Store = (*Ledger)(nil)
	_ watcher.View  = (*View)(nil)
)

// View opens a reading for a pass.
func (l *Ledger) View() (watcher.View, error) {
	v, err := l.Read()
	if err != nil {
		return nil, err
	}
	return v, nil
}

// Read opens a reading with all that a ledger can tell.
func (l *Ledger) Read() (v *View, err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	tx, err := l.db.Begin(false)
	if err != nil {
		return nil, err
	}
	v = &View{l: l, tx: tx, chunks: map[uint32]namePart{}}
	l.readings.Add(1)
	if err := v.begin(); err != nil {
		l.readings.Add(-1)
		_ = tx.Rollback() // the error to tell is the first
		return nil, err
	}
	return v, nil
}

func (v *View) begin() (err error) {
	for b := range buckets {
		v.buckets[b] = v.tx.Bucket(b.name())
		if v.buckets[b] == nil {
			return &Damaged{Where: b.String(), Why: "the bucket is not there"}
		}
		v.cursors[b] = v.buckets[b].Cursor()
	}
	v.head, err = readHead(v.buckets[inMeta])
	v.whole = v.head.step
	return err
}

// Close ends the reading.
func (v *View) Close() error {
	if v.tx == nil {
		return nil
	}
	tx := v.tx
	v.tx = nil
	v.l.readings.Add(-1)
	return tx.Rollback()
}

// enter begins a method's reading: use as
//
//	defer v.leave(v.enter(&err), &err)
//	if err != nil { return }
func (v *View) enter(err *error) (faults bool) {
	if v.tx == nil {
		*err = errDone
	}
	return debug.SetPanicOnFault(true)
}

// leave is guard for a reading.
func (v *View) leave(faults bool, err *error) {
	debug.SetPanicOnFault(faults)
	if r := recover(); r != nil {
		*err = &Damaged{Path: v.l.path, Why: fmt.Sprintf("a page cannot be read (%v)", r)}
	} else if *err != nil {
		name(v.l.path, *err)
	}
}

// Step is the last published step.
func (v *View) Step() uint32 { return v.head.step }

// AsOf is the same reading as of an earlier step; see watcher.View.
func (v *View) AsOf(step uint32) watcher.View {
	then := *v
	then.head.step = min(step, v.head.step)
	return &then
}

// NextRef is the ref that the next flag gets.
func (v *View) NextRef() uint64 { return v.head.nextRef }

// get fetches and checks a value; nil when there is none.
func (v *View) get(in bucket, key []byte) ([]byte, error) {
	value := v.buckets[in].Get(key)
	if value == nil {
		return nil, nil
	}
	return opened(in, key, value)
}

// each calls do with every published value whose key has the prefix, checked, until it returns false or an error.
func (v *View) each(in bucket, prefix []byte, do func(key, body []byte) (bool, error)) error {
	c := v.buckets[in].Cursor()
	for k, value := c.Seek(prefix); k != nil && hasPrefix(k, prefix); k, value = c.Next() {
		if !published(in, k, v.head) {
			continue
		}
		body, err := checked(in, k, value)
		if err != nil {
			return err
		}
		if more, err := do(k, body); err != nil || !more {
			return err
		}
	}
	return nil
}

// checked is opened for a key that was found by walking: its length is checked too.
func checked(in bucket, key, value []byte) ([]byte, error) {
	if n := in.keySize(); n != 0 && len(key) != n {
		return nil, malformed(in, key, "its key has the wrong length")
	}
	return opened(in, key, value)
}

func hasPrefix(k, prefix []byte) bool {
	return len(k) >= len(prefix) && string(k[:len(prefix)]) == string(prefix)
}
