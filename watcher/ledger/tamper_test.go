package ledger

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"testing"

	bolt "go.etcd.io/bbolt"

	"strayd/rules"
)

// forger changes a ledger's file as somebody who knows how it is made would: whatever is changed gets its checksum, and the totals follow.
type forger struct {
	t    *testing.T
	tx   *bolt.Tx
	head head
}

// forge copies a ledger and lets somebody change the copy.
func forge(t *testing.T, path string, change func(*forger)) string {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	forged := filepath.Join(t.TempDir(), "forged.db")
	if err := os.WriteFile(forged, data, 0o600); err != nil {
		t.Fatal(err)
	}
	db, err := bolt.Open(forged, 0o600, nil)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	if err := db.Update(func(tx *bolt.Tx) error {
		f := &forger{t: t, tx: tx}
		if f.head, err = readHead(tx.Bucket(inMeta.name())); err != nil {
			return err
		}
		change(f)
		return f.finish()
	}); err != nil {
		t.Fatal(err)
	}
	return forged
}

func (f *forger) put(in bucket, key, body []byte) {
	f.t.Helper()
	value := append(make([]byte, sealSize), body...)
	seal(in, key, value)
	if err := f.tx.Bucket(in.name()).Put(key, value); err != nil {
		f.t.Fatal(err)
	}
}

func (f *forger) remove(in bucket, key []byte) {
	f.t.Helper()
	if f.tx.Bucket(in.name()).Get(key) == nil {
		f.t.Fatalf("%s is not there", place(in, key))
	}
	if err := f.tx.Bucket(in.name()).Delete(key); err != nil {
		f.t.Fatal(err)
	}
}

func (f *forger) finish() error {
	var sums totals
	for b := inMeta + 1; b < buckets; b++ {
		if err := f.tx.Bucket(b.name()).ForEach(func(_, v []byte) error { sums[b].add(sealOf(v)); return nil }); err != nil {
			return err
		}
	}
	meta := f.tx.Bucket(inMeta.name())
	if err := putMeta(meta, keyTotals, packTotals(make([]byte, sealSize), &sums)); err != nil {
		return err
	}
	return putMeta(meta, keyHead, packHead(make([]byte, sealSize), f.head))
}

func (f *forger) entry(n uint64) *Entry {
	f.t.Helper()
	key := put64(nil, n)
	body, err := opened(inRecord, key, f.tx.Bucket(inRecord.name()).Get(key))
	if err != nil {
		f.t.Fatal(err)
	}
	e, ok := unpackEntry(n, bytes.Clone(body))
	if !ok {
		f.t.Fatal("no entry")
	}
	return &e
}

func (f *forger) putEntry(e *Entry) { f.put(inRecord, put64(nil, e.Number), packEntry(nil, e)) }

// rechain gives every entry from one on the hash that fits, up to the head.
func (f *forger) rechain(from uint64) {
	for n := from; n <= f.head.records; n++ {
		e := f.entry(n)
		if n > 1 {
			e.Prev = f.entry(n - 1).Hash
		}
		e.Hash = e.link()
		f.putEntry(e)
		f.head.chain = e.Hash
	}
}

// flag changes the row of the decided flag that a step wrote.
func (f *forger) flag(step uint32, change func(*flagRow)) {
	f.t.Helper()
	key := flagKey(1, step)
	body, err := opened(inFlags, key, f.tx.Bucket(inFlags.name()).Get(key))
	if err != nil {
		f.t.Fatal(err)
	}
	row, ok := unpackFlag(1, bytes.Clone(body))
	if !ok {
		f.t.Fatal("no flag")
	}
	change(&row)
	f.put(inFlags, key, packFlag(nil, &row))
}

// Entries 1, 2, 4, 6, 8 are settings; 3, 5, 7, 9 decisions of steps 2 to 5 about flag 1. Whatever somebody changes of them, with all
// checksums put right, is found; and a whole older state only by the head that was noted.
func TestForgedDecisionsAreFound(t *testing.T) {
	path, heads := furnished(t)
	if _, err := verify(forge(t, path, func(*forger) {})); err != nil {
		t.Fatalf("nothing changed: %v", err)
	}
	edit := func(e *Entry) { e.Body = bytes.Replace(e.Body, []byte("as printed"), []byte("as I like it"), 1) }
	for what, change := range map[string]func(*forger){
		"edited": func(f *forger) { e := f.entry(5); edit(e); f.putEntry(e) },
		"another's name": func(f *forger) {
			e := f.entry(9)
			e.Who = "bob (uid 7)"
			f.putEntry(e)
			f.rechain(9)
		},
		"edited, hashed anew": func(f *forger) { e := f.entry(5); edit(e); e.Hash = e.link(); f.putEntry(e) },
		"edited, the chain made anew": func(f *forger) {
			e := f.entry(5)
			edit(e)
			f.putEntry(e)
			f.rechain(5)
		},
		"removed in the middle": func(f *forger) { f.remove(inRecord, put64(nil, 5)) },
		"removed in the middle, the chain made anew": func(f *forger) {
			for n := uint64(5); n < 9; n++ {
				e := f.entry(n + 1)
				e.Number = n
				f.putEntry(e)
			}
			f.remove(inRecord, put64(nil, 9))
			f.head.records--
			f.rechain(5)
		},
		"reordered": func(f *forger) {
			a, b := f.entry(5), f.entry(7)
			a.Number, b.Number = 7, 5
			f.putEntry(a)
			f.putEntry(b)
		},
		"reordered, the chain made anew": func(f *forger) {
			a, b := f.entry(5), f.entry(7)
			a.Body, b.Body = b.Body, a.Body
			f.putEntry(a)
			f.putEntry(b)
			f.rechain(5)
		},
		"the end cut off": func(f *forger) {
			f.remove(inRecord, put64(nil, 9))
			f.head.records--
			f.head.chain = f.entry(8).Hash
		},
		"the flag decided otherwise": func(f *forger) {
			f.flag(5, func(r *flagRow) { r.flag.Last.Conclusion, r.flag.Last.Value = rules.Genuine, rules.Missing })
		},
		"an earlier row of the flag": func(f *forger) { f.flag(3, func(r *flagRow) { r.flag.Last.Note = "as I like it" }) },
		"the flag signed off":        func(f *forger) { f.flag(5, func(r *flagRow) { r.flag.Standing = rules.SignedOff }) },
		"an earlier row gone":        func(f *forger) { f.remove(inFlags, flagKey(1, 3)) },
		"the newest row gone":        func(f *forger) { f.remove(inFlags, flagKey(1, 5)) },
	} {
		if _, err := verify(forge(t, path, change)); !isDamaged(err) {
			t.Errorf("%s: %v", what, err)
		}
	}
	older, _ := furnishedSteps(t, 4)
	if _, err := verify(older); err != nil {
		t.Fatal(err)
	}
	l, err := Open(older, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if _, err := l.Verify(context.Background(), VerifyOptions{Head: heads[len(heads)-1]}); !isDamaged(err) {
		t.Errorf("an older state in the ledger's place: %v", err)
	}
}
