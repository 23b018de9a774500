package ledger

import (
	"crypto/sha256"
	"encoding/json"
	"fmt"
	"slices"
	"time"

	"strayd/rules"
)

// A notice stands in inOutbox under its number, in inOutboxKey under the digest of its dedupe key, and, until it is sent or
// withdrawn, in inQueue under its channel.

func queueKey(channel string, number uint64) []byte {
	return put64(queuePrefix(channel), number)
}

// queuePrefix holds the channel with its length before it, so that no channel is the start of another.
func queuePrefix(channel string) []byte {
	return append(put16(nil, uint16(len(channel))), channel...)
}

func outboxDigest(key string) []byte {
	sum := sha256.Sum256([]byte(key))
	return sum[:]
}

// queued says whether a notice of this state stands in its channel's queue.
func queued(s rules.NoticeState) bool {
	return s == rules.NoticeWaiting || s == rules.NoticeSending || s == rules.NoticeFailed
}

func packNotice(dst []byte, n *rules.Notice) []byte {
	text, err := json.Marshal(n)
	if err != nil {
		panic(err) // plain values always encode
	}
	return append(dst, text...)
}

func unpackNotice(number uint64, body []byte) (n rules.Notice, ok bool) {
	err := json.Unmarshal(body, &n)
	return n, err == nil && n.Number == number && slices.Contains(rules.NoticeStates, n.State)
}

// enqueue puts new notices; one whose key is there already is passed over.
func (w *writer) enqueue(notices []rules.Notice) error {
	for _, n := range notices {
		digest := outboxDigest(n.Key)
		if w.buckets[inOutboxKey].Get(digest) != nil {
			continue
		}
		if n.Kind.Follows() {
			told, err := w.told(&n)
			if err != nil {
				return err
			}
			if n.Answers = told; told == 0 && n.Kind == rules.KindUpdate {
				continue
			}
		}
		if n.Key == "" || n.Channel == "" || !slices.Contains(rules.NoticeStates, n.State) {
			return fmt.Errorf("notice %q for channel %q in state %q cannot be kept", n.Key, n.Channel, n.State)
		}
		w.head.notices++
		n.Number = w.head.notices
		number := put64(nil, n.Number)
		if err := w.put(inOutboxKey, digest, func(dst []byte) []byte { return append(dst, number...) }); err != nil {
			return err
		}
		if err := w.notice(&n); err != nil {
			return err
		}
	}
	return nil
}

// mostAgo is how many notices back the one is looked for that an update goes with.
const mostAgo = 2000

// told is the newest notice to the channel of an update that told of one of its flags, 0 when none did: what a channel was not told of is
// not updated there.
func (w *writer) told(update *rules.Notice) (uint64, error) {
	c := w.buckets[inOutbox].Cursor()
	k, value := c.Last()
	for ago := 0; k != nil && ago < mostAgo; k, value = c.Prev() {
		body, err := checked(inOutbox, k, value)
		if err != nil {
			return 0, err
		}
		n, ok := unpackNotice(get64(k), body)
		if !ok {
			return 0, malformed(inOutbox, k, "it cannot be read")
		}
		if n.Channel == update.Channel && !n.Kind.Follows() && n.State != rules.NoticeWithdrawn &&
			slices.ContainsFunc(n.Refs, func(r uint64) bool { return slices.Contains(update.Refs, r) }) {
			return n.Number, nil
		}
		ago++
	}
	return 0, nil
}

// notice puts a notice and keeps its channel's queue right.
func (w *writer) notice(n *rules.Notice) error {
	if err := w.replace(inOutbox, put64(nil, n.Number), func(dst []byte) []byte { return packNotice(dst, n) }); err != nil {
		return err
	}
	key := queueKey(n.Channel, n.Number)
	if !queued(n.State) {
		return w.remove(inQueue, key)
	}
	return w.replace(inQueue, key, func(dst []byte) []byte { return append(dst, byte(slices.Index(rules.NoticeStates, n.State))) })
}

// withdraw takes back the waiting notices that tell of nothing but the given flags.
func (w *writer) withdraw(refs []uint64) error {
	if len(refs) == 0 {
		return nil
	}
	gone := map[uint64]bool{}
	for _, r := range refs {
		gone[r] = true
	}
	var back []rules.Notice
	c := w.buckets[inQueue].Cursor()
	for k, value := c.First(); k != nil; k, value = c.Next() {
		n, err := w.queuedNotice(k, value)
		if err != nil {
			return err
		}
		if n.State == rules.NoticeWaiting && len(n.Refs) > 0 && !slices.ContainsFunc(n.Refs, func(r uint64) bool { return !gone[r] }) {
			n.State = rules.NoticeWithdrawn
			back = append(back, n)
		}
	}
	for i := range back {
		if err := w.notice(&back[i]); err != nil {
			return err
		}
	}
	return nil
}

func (w *writer) queuedNotice(k, value []byte) (n rules.Notice, err error) {
	if _, err := checked(inQueue, k, value); err != nil {
		return n, err
	}
	number := k[len(k)-8:]
	body, err := checked(inOutbox, number, w.buckets[inOutbox].Get(number))
	if err != nil {
		return n, err
	}
	n, ok := unpackNotice(get64(number), body)
	if !ok {
		return n, malformed(inOutbox, number, "it cannot be read")
	}
	return n, nil
}

// Add enqueues notices outside of a step. One whose key is there already is passed over.
func (l *Ledger) Add(notices []rules.Notice) error {
	if len(notices) == 0 {
		return nil
	}
	return l.write(nil, func(w *writer) error { return w.enqueue(notices) })
}

// Mark records the new state of a notice under its number, also in the queue of another channel than before. It is durable when Mark returns. A notice that was withdrawn
// meanwhile stays so, with an error.
func (l *Ledger) Mark(n rules.Notice) error {
	return l.write(nil, func(w *writer) error {
		key := put64(nil, n.Number)
		value := w.buckets[inOutbox].Get(key)
		if value == nil {
			return fmt.Errorf("notice %d %w", n.Number, ErrNone)
		}
		body, err := checked(inOutbox, key, value)
		if err != nil {
			return err
		}
		held, ok := unpackNotice(n.Number, body)
		switch {
		case !ok:
			return malformed(inOutbox, key, "it cannot be read")
		case held.State == rules.NoticeWithdrawn:
			return fmt.Errorf("notice %d was withdrawn", n.Number)
		}
		if held.Channel != n.Channel {
			if err := w.remove(inQueue, queueKey(held.Channel, n.Number)); err != nil {
				return err
			}
		}
		return w.notice(&n)
	})
}

// reading calls do with a reading and ends it.
func (l *Ledger) reading(do func(*View) error) error {
	v, err := l.Read()
	if err != nil {
		return err
	}
	err = do(v)
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	return err
}

// Next is the oldest waiting notice of a channel; ok is false when there is none.
func (l *Ledger) Next(channel string) (n rules.Notice, ok bool, err error) {
	err = l.reading(func(v *View) error {
		return v.queue(channel, rules.NoticeWaiting, func(found rules.Notice) bool {
			n, ok = found, true
			return false
		})
	})
	return n, ok, err
}

// Waiting lists the waiting notices of a channel, the oldest first.
func (l *Ledger) Waiting(channel string) (list []rules.Notice, err error) {
	err = l.reading(func(v *View) error {
		return v.queue(channel, rules.NoticeWaiting, func(n rules.Notice) bool {
			list = append(list, n)
			return true
		})
	})
	return list, err
}

// Sending lists the notices of a channel whose last attempt has no recorded outcome.
func (l *Ledger) Sending(channel string) (list []rules.Notice, err error) {
	err = l.reading(func(v *View) error {
		return v.queue(channel, rules.NoticeSending, func(n rules.Notice) bool {
			list = append(list, n)
			return true
		})
	})
	return list, err
}

// Depth counts the waiting and the failed notices of a channel, and tells when the oldest waiting one was made.
func (l *Ledger) Depth(channel string) (waiting, failed int, oldest time.Time, err error) {
	err = l.reading(func(v *View) error {
		return v.queue(channel, "", func(n rules.Notice) bool {
			if n.State == rules.NoticeFailed {
				failed++
				return true
			}
			if waiting++; waiting == 1 {
				oldest = n.Made
			}
			return true
		})
	})
	return waiting, failed, oldest, err
}

// Notices calls each with every notice by number, until it returns false.
func (l *Ledger) Notices(each func(rules.Notice) bool) error {
	return l.reading(func(v *View) error { return v.Notices(each) })
}

// LastSlot is what Done was told last of a job, the zero time when nothing.
func (l *Ledger) LastSlot(job string) (slot time.Time, err error) {
	err = l.reading(func(v *View) error {
		slot, err = v.slot(job)
		return err
	})
	return slot, err
}

// Done remembers up to where the slots of a job are done.
func (l *Ledger) Done(job string, slot time.Time) error {
	return l.write(nil, func(w *writer) error {
		return w.replace(inSlots, []byte(job), func(dst []byte) []byte {
			p := packer{dst}
			p.time(slot)
			return p.b
		})
	})
}
