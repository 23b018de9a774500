package ledger

import (
	"bytes"
	"runtime/debug"

	bolt "go.etcd.io/bbolt"
)

// sweepKeys is how many keys one commit of a sweep removes.
const sweepKeys = 4096

// sweepLeft removes what an earlier failure left staged. Called with the lock held.
func (l *Ledger) sweepLeft() error {
	if !l.left {
		return nil
	}
	err := l.sweep()
	l.left = err != nil
	return err
}

// sweep removes every staged value that was never published, in bounded commits, then the note of them.
func (l *Ledger) sweep() (err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	for more := true; more && err == nil; {
		err = l.db.Update(func(tx *bolt.Tx) (err error) {
			more, err = sweepSome(tx)
			return err
		})
	}
	return err
}

func sweepSome(tx *bolt.Tx) (more bool, err error) {
	meta := tx.Bucket(inMeta.name())
	s, held, err := readStaging(meta)
	if err != nil || !held {
		return false, err
	}
	h, err := readHead(meta)
	if err != nil {
		return false, err
	}
	room := sweepKeys
	for _, n := range s.spans {
		gone := n.unpublished(tx.Bucket(n.in.name()), h, room)
		for _, key := range gone {
			if err := tx.Bucket(n.in.name()).Delete(key); err != nil {
				return false, err
			}
		}
		if room -= len(gone); room <= 0 {
			return true, nil
		}
	}
	return false, meta.Delete([]byte(keyStaging))
}

func readStaging(meta *bolt.Bucket) (s staging, held bool, err error) {
	if meta.Get([]byte(keyStaging)) == nil {
		return s, false, nil
	}
	body, err := metaRow(meta, keyStaging)
	if err != nil {
		return s, false, err
	}
	s, ok := unpackStaging(body)
	if !ok {
		return s, false, malformed(inMeta, []byte(keyStaging), "it cannot be read")
	}
	return s, true, nil
}

// unpublished lists up to room keys of the span that no reader sees. They are listed before any is removed: a cursor skips
// keys when the bucket changes under it.
func (n *span) unpublished(b *bolt.Bucket, h head, room int) (keys [][]byte) {
	c := b.Cursor()
	for k, _ := c.Seek(n.low); k != nil && bytes.Compare(k, n.high) <= 0 && len(keys) < room; k, _ = c.Next() {
		if !published(n.in, k, h) {
			keys = append(keys, bytes.Clone(k))
		}
	}
	return keys
}

// published says whether readers see the value of a key.
func published(in bucket, key []byte, h head) bool {
	switch {
	case len(key) != in.keySize() && in.keySize() != 0:
		return true // damage, which is not swept but reported
	case in == inFlagAt:
		return get64(key[9:]) < h.nextRef
	case in.layered() && len(key) >= 4:
		return stepOf(key) <= h.step
	}
	return true
}
