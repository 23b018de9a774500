package ledger

import (
	"fmt"

	bolt "go.etcd.io/bbolt"

	"strayd/watcher"
)

// Files calls each with every file row by step, until it returns false.
func (v *View) Files(each func(watcher.FileRow) bool) error {
	return v.rowByRow(inFiles, func(k, body []byte) (bool, error) {
		f, ok := unpackFile(body)
		if !ok {
			return false, malformed(inFiles, k, "it cannot be read")
		}
		f.Step = get32(k)
		return each(f), nil
	})
}

// Passes calls each with every row of the run record, oldest first, until it returns false.
func (v *View) Passes(each func(watcher.PassRow) bool) error {
	return v.rowByRow(inPasses, func(k, body []byte) (bool, error) {
		r, ok := unpackPass(body)
		if !ok {
			return false, malformed(inPasses, k, "it cannot be read")
		}
		r.Number = get32(k)
		return each(r), nil
	})
}

// Record calls each with every entry of the record, oldest first, until it returns false.
func (v *View) Record(each func(Entry) bool) error {
	return v.rowByRow(inRecord, func(k, body []byte) (bool, error) {
		e, ok := unpackEntry(get64(k), body)
		if !ok {
			return false, malformed(inRecord, k, "it cannot be read")
		}
		return each(e), nil
	})
}

// rowByRow calls do with every value of a bucket. Only the reading stands behind the guard, so that a panic in the caller's
// function is not taken for damage.
func (v *View) rowByRow(in bucket, do func(key, body []byte) (bool, error)) error {
	if v.tx == nil {
		return errDone
	}
	c := v.buckets[in].Cursor()
	for first := true; ; first = false {
		k, body, err := v.next(in, c, first)
		if err != nil || k == nil {
			return err
		}
		more, err := do(k, body)
		if err != nil {
			name(v.l.path, err)
			return err
		}
		if !more {
			return nil
		}
	}
}

func (v *View) next(in bucket, c *bolt.Cursor, first bool) (k, body []byte, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, nil, err
	}
	move := c.Next
	if first {
		move = c.First
	}
	k, value := move()
	if k == nil {
		return nil, nil, nil
	}
	body, err = checked(in, k, value)
	return k, body, err
}

// LastPass is the newest row of the run record; ok is false when there is none.
func (v *View) LastPass() (r watcher.PassRow, ok bool, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil || v.head.passes == 0 {
		return r, false, err
	}
	key := put32(nil, v.head.passes)
	body, err := v.get(inPasses, key)
	if err != nil {
		return r, false, err
	}
	if body == nil {
		return r, false, malformed(inPasses, key, "it is not there")
	}
	if r, ok = unpackPass(body); !ok {
		return r, false, malformed(inPasses, key, "it cannot be read")
	}
	r.Number = v.head.passes
	return r, true, nil
}

// Head is the hash of the newest entry of the record, in hexadecimal; "" when the record is empty.
func (v *View) Head() (string, error) {
	if v.head.records == 0 {
		return "", nil
	}
	return fmt.Sprintf("%x", v.head.chain), nil
}
