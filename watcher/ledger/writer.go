package ledger

import (
	"errors"
	"fmt"
	"runtime"
	"runtime/debug"

	bolt "go.etcd.io/bbolt"
)

// commitSize is how many bytes of encoded values one commit of a large batch takes. bbolt copies them into fresh pages; past
// that, first touching those costs more than the fewer commits save. A day of a million series fits one commit.
const commitSize = 8 << 20

// writer is one write: a transaction, or, when it spills, several of which only the last is seen.
type writer struct {
	l       *Ledger
	tx      *bolt.Tx
	buckets [buckets]*bolt.Bucket
	head    head
	totals  totals
	limit   int    // bytes in a commit, 0 for no limit
	plan    *plan  // what is staged, noted at the first spill
	spilled bool   // something is committed that is not published
	pending int    // small values put since the last commit, counted as bytes
	coming  int64  // bytes that the batch takes, about
	garbage int64  // bytes committed since the last collection; of a new batch, all that made it may be garbage
	dropped []drop // values that a newer layer replaces, removed when it is published
}

type drop struct {
	in  bucket
	key []byte
}

// write runs one change of the ledger and commits it, or leaves everything as it was.
func (l *Ledger) write(p *plan, change func(*writer) error) (err error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.broken != nil {
		return l.broken
	}
	if err := l.sweepLeft(); err != nil {
		return err
	}
	w := &writer{l: l, plan: p}
	err = w.run(change)
	if err == nil {
		return nil
	}
	if w.spilled {
		l.left = true
		err = errors.Join(err, l.sweepLeft())
	}
	return err
}

// run does the change; a panic leaves bbolt's locks held, so it switches writing off.
func (w *writer) run(change func(*writer) error) (err error) {
	done := false
	defer func() {
		if isDamaged(err) && !done {
			w.l.broken = err
		}
	}()
	defer guard(w.l.path, debug.SetPanicOnFault(true), &err)
	defer func() { w.l.arena = w.l.arena[:0] }()
	if err = w.start(); err == nil {
		err = change(w)
	}
	if err == nil {
		err = w.finish()
	}
	if err != nil && w.tx != nil {
		err = errors.Join(err, w.tx.Rollback())
	}
	done = true
	return err
}

// start begins a transaction and reads where things stand.
func (w *writer) start() error {
	if err := w.open(); err != nil {
		return err
	}
	var err error
	if w.head, err = readHead(w.buckets[inMeta]); err != nil {
		return err
	}
	w.totals, err = readTotals(w.buckets[inMeta])
	return err
}

func (w *writer) open() (err error) {
	if w.tx, err = w.l.db.Begin(true); err != nil {
		return err
	}
	for b := range buckets {
		w.buckets[b] = w.tx.Bucket(b.name())
		if w.buckets[b] == nil {
			return &Damaged{Where: b.String(), Why: "the bucket is not there"}
		}
		w.buckets[b].FillPercent = 1 // nearly all keys are appended
	}
	return nil
}

func readTotals(meta *bolt.Bucket) (totals, error) {
	body, err := metaRow(meta, keyTotals)
	if err != nil {
		return totals{}, err
	}
	t, ok := unpackTotals(body)
	if !ok {
		return t, malformed(inMeta, []byte(keyTotals), "it cannot be read")
	}
	return t, nil
}

// commit ends the transaction. Errors of the disk (full, unwritable) come back as they are; nothing of it is then seen.
func (w *writer) commit() error {
	tx := w.tx
	w.tx = nil
	if err := tx.Commit(); err != nil {
		return fmt.Errorf("ledger %s cannot be written: %w", w.l.path, err)
	}
	return nil
}

// put encodes a value behind its seal and stores it. It spills first when the transaction has grown to its limit.
func (w *writer) put(in bucket, key []byte, encode func([]byte) []byte) error {
	if w.limit > 0 && len(w.l.arena)+w.pending >= w.limit {
		if err := w.spill(); err != nil {
			return err
		}
	}
	from := len(w.l.arena)
	w.l.arena = encode(append(w.l.arena, make([]byte, sealSize)...))
	value := w.l.arena[from:len(w.l.arena):len(w.l.arena)]
	w.pending += smallCost
	w.totals[in].add(seal(in, key, value))
	return w.buckets[in].Put(key, value)
}

// smallCost is about what bbolt keeps in memory for a key, however small its value.
const smallCost = 150

// spill commits what was put so far, unseen, and goes on in a new transaction.
func (w *writer) spill() error {
	if !w.spilled {
		note := packStaging(make([]byte, sealSize), w.plan.staging())
		if err := putMeta(w.buckets[inMeta], keyStaging, note); err != nil {
			return err
		}
	}
	if err := w.commit(); err != nil {
		return err
	}
	w.spilled = true
	w.collect()
	w.l.arena, w.pending = w.l.arena[:0], 0
	if err := w.open(); err != nil {
		return err
	}
	w.grow(0)
	return nil
}

// collect collects garbage after a commit: the pages just written serve the next one. Otherwise every commit touches fresh memory,
// which costs more than the collection. Where the batch is large, so is what a collection goes through: then it waits until the pages
// are a share of the batch.
func (w *writer) collect() {
	w.garbage += int64(len(w.l.arena) + 3*w.pending)
	if w.garbage >= w.coming/16 {
		runtime.GC()
		w.garbage = 0
	}
}

// replace stores a value under a key that may be taken.
func (w *writer) replace(in bucket, key []byte, encode func([]byte) []byte) error {
	if err := w.remove(in, key); err != nil {
		return err
	}
	return w.put(in, key, encode)
}

// remove takes a published value away.
func (w *writer) remove(in bucket, key []byte) error {
	old := w.buckets[in].Get(key)
	if old == nil {
		return nil
	}
	if _, err := opened(in, key, old); err != nil {
		return err
	}
	w.totals[in].drop(sealOf(old))
	return w.buckets[in].Delete(key)
}

// finish publishes: replaced layers go, the head and the totals move on, the note of what was staged is struck.
func (w *writer) finish() error {
	for _, d := range w.dropped {
		if err := w.remove(d.in, d.key); err != nil {
			return err
		}
	}
	meta := w.buckets[inMeta]
	if err := putMeta(meta, keyHead, packHead(make([]byte, sealSize), w.head)); err != nil {
		return err
	}
	if err := putMeta(meta, keyTotals, packTotals(make([]byte, sealSize), &w.totals)); err != nil {
		return err
	}
	if w.spilled {
		if err := meta.Delete([]byte(keyStaging)); err != nil {
			return err
		}
	}
	return w.commit()
}
