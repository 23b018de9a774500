package ledger

import (
	"bytes"
	"slices"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// Notices calls each with every notice by number, until it returns false.
func (v *View) Notices(each func(rules.Notice) bool) error {
	return v.rowByRow(inOutbox, func(k, body []byte) (bool, error) {
		n, ok := unpackNotice(get64(k), body)
		if !ok {
			return false, malformed(inOutbox, k, "it cannot be read")
		}
		return each(n), nil
	})
}

// Notice finds a notice by its number.
func (v *View) Notice(number uint64) (n rules.Notice, ok bool, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return n, false, err
	}
	key := put64(nil, number)
	body, err := v.get(inOutbox, key)
	if err != nil || body == nil {
		return n, false, err
	}
	if n, ok = unpackNotice(number, body); !ok {
		return n, false, malformed(inOutbox, key, "it cannot be read")
	}
	return n, true, nil
}

// queue calls each with the notices of a channel's queue that are in a state ("" for any), by number, until it returns false.
func (v *View) queue(channel string, state rules.NoticeState, each func(rules.Notice) bool) error {
	numbers, err := v.queueNumbers(channel, state)
	if err != nil {
		return err
	}
	for _, number := range numbers {
		n, ok, err := v.Notice(number)
		if err != nil {
			return err
		}
		if !ok {
			return malformed(inQueue, queueKey(channel, number), "its notice is not there")
		}
		if n.Answers != 0 {
			told, _, err := v.Notice(n.Answers)
			if err != nil {
				return err
			}
			n.Under = told.Receipt
		}
		if !each(n) {
			return nil
		}
	}
	return nil
}

func (v *View) queueNumbers(channel string, state rules.NoticeState) (numbers []uint64, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	prefix := queuePrefix(channel)
	return numbers, v.each(inQueue, prefix, func(k, body []byte) (bool, error) {
		if len(k) != len(prefix)+8 || len(body) != 1 || int(body[0]) >= len(rules.NoticeStates) {
			return false, malformed(inQueue, k, "it cannot be read")
		}
		if state == "" || rules.NoticeStates[body[0]] == state {
			numbers = append(numbers, get64(k[len(prefix):]))
		}
		return true, nil
	})
}

// slot is up to where the slots of a job are done, the zero time for a job that is not known.
func (v *View) slot(job string) (slot time.Time, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return slot, err
	}
	body, err := v.get(inSlots, []byte(job))
	if err != nil || body == nil {
		return slot, err
	}
	u := unpacker{b: body}
	if slot = u.time(); !u.whole() {
		return slot, malformed(inSlots, []byte(job), "it cannot be read")
	}
	return slot, nil
}

// Layers calls each with every layer of a column, oldest first: the step that wrote it and its cells at w.Places() decimals,
// Missing64 where it has none. The cells are valid in the call only.
func (v *View) Layers(w watcher.What, date rules.Date, block uint32, each func(step uint32, vals []int64) error) (err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return err
	}
	in := bucketOf(w)
	key := columnKey(nil, date, block, 0)
	cells := make([]int64, watcher.BlockSize)
	c := v.buckets[in].Cursor()
	for k, value := c.Seek(key); hasPrefix(k, key[:8]); k, value = c.Next() {
		if len(k) == 12 && stepOf(k) > v.head.step {
			break
		}
		l, err := v.layer(in, k, value)
		if err != nil {
			return err
		}
		for i := range cells {
			cells[i] = watcher.Missing64
		}
		l.overlay(cells, 0, int64(rules.Pow10(w.Places()-l.decimals)))
		if err := each(stepOf(k), cells); err != nil {
			return err
		}
	}
	return nil
}

// outbox checks a notice against its key and its queue, and the two against it.
func (c *verifier) outbox(in bucket, key, body []byte) error {
	var number uint64
	switch in {
	case inOutboxKey:
		if len(body) != 8 {
			return malformed(in, key, "it cannot be read")
		}
		number = get64(body)
	case inQueue:
		if len(key) < 10 {
			return malformed(in, key, "it cannot be read")
		}
		number = get64(key[len(key)-8:])
	default:
		number = get64(key)
	}
	n, ok, err := c.v.Notice(number)
	if err != nil {
		return err
	}
	if !ok || number == 0 || number > c.v.head.notices {
		return malformed(in, key, "there is no such notice")
	}
	at, byKey := c.v.buckets[inQueue].Get(queueKey(n.Channel, number)), c.v.buckets[inOutboxKey].Get(outboxDigest(n.Key))
	switch {
	case byKey == nil, (at != nil) != queued(n.State):
		return malformed(in, key, "its indexes do not fit it")
	case in == inOutboxKey && !bytes.Equal(key, outboxDigest(n.Key)):
		return malformed(in, key, "the notice has another key")
	case in == inQueue && (!bytes.Equal(key, queueKey(n.Channel, number)) || len(body) != 1 || int(body[0]) != slices.Index(rules.NoticeStates, n.State)):
		return malformed(in, key, "the notice is in another channel or state")
	}
	return nil
}
