package ledger

import (
	"encoding/binary"
	"fmt"

	"strayd/watcher"
)

// State is the newest stored state of a range for one block, nil when there is none.
func (v *View) State(rangeID uint16, block uint32) (s *watcher.State, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	key, value := newest(v.cursors[inStates], stateKey(rangeID, block, 0)[:6], v.head.step)
	if key == nil {
		return nil, nil
	}
	body, err := opened(inStates, key, value)
	if err != nil {
		return nil, err
	}
	s, ok := unpackState(body)
	if !ok {
		return nil, malformed(inStates, key, "it cannot be read")
	}
	s.Range, s.Block, s.Step = rangeID, block, stepOf(key)
	return s, nil
}

// FileSeen finds the last step at which a file of this content came under the same feed and feed settings.
func (v *View) FileSeen(feed string, sha [32]byte, feedKey string) (f watcher.FileRow, seen bool, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return f, false, err
	}
	key := fileDigest(feed, sha, feedKey)
	body, err := v.get(inFileAt, key)
	if body == nil || err != nil {
		return f, false, err
	}
	if len(body) != 4 {
		return f, false, malformed(inFileAt, key, "it cannot be read")
	}
	f, err = v.fileRow(get32(body))
	return f, err == nil, err
}

// File is the file row of a step; ErrNone (wrapped) when the step has none.
func (v *View) File(step uint32) (f watcher.FileRow, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return f, err
	}
	return v.fileRow(step)
}

func (v *View) fileRow(step uint32) (f watcher.FileRow, err error) {
	key := put32(nil, step)
	body, err := v.get(inFiles, key)
	if err != nil {
		return f, err
	}
	if body == nil {
		return f, fmt.Errorf("file of step %d %w", step, ErrNone)
	}
	f, ok := unpackFile(body)
	if !ok {
		return f, malformed(inFiles, key, "it cannot be read")
	}
	f.Step = step
	return f, nil
}

// Ranges lists the numbered range definitions, by number.
func (v *View) Ranges() (list []watcher.RangeKey, err error) {
	err = v.walk(inRanges, nil, func(k, body []byte) (bool, error) {
		list = append(list, watcher.RangeKey{ID: binary.BigEndian.Uint16(k), Key: string(body)})
		return true, nil
	})
	return list, err
}

// walk is each behind the guard.
func (v *View) walk(in bucket, prefix []byte, do func(key, body []byte) (bool, error)) (err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return err
	}
	return v.each(in, prefix, do)
}

// GroupScales gives the deviations that a group lent, by date, then step.
func (v *View) GroupScales(rangeID uint16, group string) (list []watcher.GroupScale, err error) {
	prefix := scalePrefix(rangeID, group)
	err = v.walk(inScales, prefix, func(k, body []byte) (bool, error) {
		if len(k) != len(prefix)+8 {
			return false, malformed(inScales, k, "its key has the wrong length")
		}
		s := watcher.GroupScale{Range: rangeID, Group: group, Date: unordered(get32(k[len(prefix):])), Step: stepOf(k)}
		if !unpackScale(body, &s) {
			return false, malformed(inScales, k, "it cannot be read")
		}
		list = append(list, s)
		return true, nil
	})
	return list, err
}

// Settings is the settings text of a number; ErrNone (wrapped) when there is none.
func (v *View) Settings(id uint32) (text []byte, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	body, err := v.get(inSettings, put32(nil, id))
	if err == nil && body == nil {
		err = fmt.Errorf("settings number %d %w", id, ErrNone)
	}
	return append([]byte{}, body...), err
}

// LastSettings is the number of the newest settings text, 0 when there is none.
func (v *View) LastSettings() (uint32, error) { return v.head.settings, nil }
