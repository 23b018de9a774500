package ledger

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"strings"

	"strayd/rules"
	"strayd/watcher"
)

// value checks the content of a published value, and what other buckets must say for it to be true.
func (c *verifier) value(in bucket, key, body []byte) error {
	switch in {
	case inNames:
		return c.names(key, body)
	case inReturns, inPrices:
		return c.column(in, key, body)
	case inUsed:
		return c.used(key, body)
	case inStates:
		return c.state(key, body)
	case inFiles, inFileAt:
		return c.file(in, key, body)
	case inRecord:
		return c.entry(key, body)
	case inFlags, inFlagAt, inOpen:
		return c.flag(in, key, body)
	case inOutbox, inOutboxKey, inQueue:
		return c.outbox(in, key, body)
	}
	return c.row(in, key, body)
}

// row checks the smaller kinds.
func (c *verifier) row(in bucket, key, body []byte) error {
	ok := true
	switch in {
	case inScales:
		ok = unpackScale(body, new(watcher.GroupScale))
	case inPasses:
		_, ok = unpackPass(body)
		ok = ok && get32(key) >= 1 && get32(key) <= c.v.head.passes
	case inSlots:
		u := unpacker{b: body}
		u.time()
		ok = u.whole()
	case inSettings:
		ok = get32(key) >= 1 && get32(key) <= c.v.head.settings
	}
	if !ok {
		return malformed(in, key, "it cannot be read, or should not be there")
	}
	return nil
}

// only sees to it that a bucket that keeps the newest layer has no second one of a key.
func (c *verifier) only(in bucket, key []byte) error {
	head := key[:len(key)-4]
	if bytes.Equal(head, c.newest) {
		return malformed(in, key, "an older one is still there")
	}
	c.newest = head
	return nil
}

func (c *verifier) names(key, body []byte) error {
	list, ok := parseChunk(body)
	want := min(int64(c.v.head.names)-int64(get32(key))*watcher.BlockSize, watcher.BlockSize)
	if !ok || int64(list.n) != want {
		return malformed(inNames, key, fmt.Sprintf("it holds %d names, and the head says %d", list.n, want))
	}
	return c.only(inNames, key)
}

func (c *verifier) column(in bucket, key, body []byte) error {
	l, why := parseLayer(body)
	if why != "" {
		return malformed(in, key, why)
	}
	last := -1
	for i := range len(l.offsets) / 2 {
		offset := int(binary.LittleEndian.Uint16(l.offsets[2*i:]))
		if offset <= last {
			return malformed(in, key, "its offsets are not ascending")
		}
		last = offset
	}
	if !l.longsFit() {
		return malformed(in, key, "its long values do not belong to its cells")
	}
	if l.shape&shapeSparse == 0 {
		last = l.n - 1
	}
	return c.offset(in, key, get32(key[4:]), last)
}

// offset sees to it that the highest offset of a block has a name.
func (c *verifier) offset(in bucket, key []byte, block uint32, last int) error {
	if uint64(block)*watcher.BlockSize+uint64(last) >= uint64(c.v.head.names) {
		return malformed(in, key, fmt.Sprintf("offset %d has no name", last))
	}
	return nil
}

func (c *verifier) used(key, body []byte) error {
	u, ok := parseCells(body)
	last := -1
	for i := 0; ok && i < u.n; i++ {
		ok = u.offset(i) > last
		last = u.offset(i)
	}
	if !ok {
		return malformed(inUsed, key, "it cannot be read")
	}
	return c.offset(inUsed, key, get32(key[6:]), last)
}

func (c *verifier) state(key, body []byte) error {
	s, ok := unpackState(body)
	if !ok {
		return malformed(inStates, key, "it cannot be read")
	}
	if err := c.offset(inStates, key, get32(key[2:]), len(s.N)-1); err != nil {
		return err
	}
	return c.only(inStates, key)
}

// file checks that a file row and its place in the index lead to each other.
func (c *verifier) file(in bucket, key, body []byte) error {
	if in == inFiles {
		f, ok := unpackFile(body)
		if !ok || get32(key) > c.v.head.step {
			return malformed(in, key, "it cannot be read, or its step is not published")
		}
		if f.Fileless() {
			return nil
		}
		step, err := c.v.get(inFileAt, fileDigest(f.File.Feed, f.File.SHA256, f.FeedKey))
		if err == nil && (len(step) != 4 || get32(step) < get32(key)) {
			err = malformed(in, key, "the index of files does not lead to it")
		}
		return err
	}
	if len(body) != 4 {
		return malformed(in, key, "it cannot be read")
	}
	f, err := c.v.fileRow(get32(body))
	if err != nil {
		return err
	}
	if !bytes.Equal(key, fileDigest(f.File.Feed, f.File.SHA256, f.FeedKey)) {
		return malformed(in, key, "it leads to another file")
	}
	return nil
}

func (c *verifier) entry(key, body []byte) error {
	e, ok := unpackEntry(get64(key), body)
	switch {
	case !ok:
		return malformed(inRecord, key, "it cannot be read")
	case e.Prev != c.chain:
		return malformed(inRecord, key, "it does not follow the entry before it")
	case e.Hash != e.link():
		return malformed(inRecord, key, "its hash is not that of its content")
	}
	c.chain = e.Hash
	if e.Kind == watcher.DecisionEntry {
		if err := c.decision(key, &e); err != nil {
			return err
		}
	}
	if strings.EqualFold(fmt.Sprintf("%x", e.Hash), c.o.Head) {
		c.report.HeadSeen = e.Number
	}
	return nil
}

// flag checks flags and their two indexes. A flag may have several layers: the first is counted for the index by series, the
// last for that of open flags.
func (c *verifier) flag(in bucket, key, body []byte) error {
	ref := get64(key[len(key)-8:])
	if in != inFlagAt {
		ref = get64(key)
	}
	newestKey, value := newest(c.v.cursors[inFlags], put64(nil, ref), c.v.head.step)
	if newestKey == nil || ref == 0 || ref >= c.v.head.nextRef {
		return malformed(in, key, "there is no such flag")
	}
	if in == inFlags {
		row, ok := unpackFlag(ref, body)
		if !ok {
			return malformed(in, key, "it cannot be read")
		}
		if err := c.acted(key, &row.flag); err != nil || !bytes.Equal(newestKey, key) {
			return err
		}
	}
	latest, err := opened(inFlags, newestKey, value)
	if err != nil {
		return err
	}
	row, ok := unpackFlag(ref, latest)
	if !ok {
		return malformed(inFlags, newestKey, "it cannot be read")
	}
	return c.indexed(in, key, &row)
}

// indexed compares one place where a flag stands with its newest row.
func (c *verifier) indexed(in bucket, key []byte, row *flagRow) error {
	f := &row.flag
	at := flagAtKey(f.Date, row.series, byte(indexOf(rules.Kinds, f.Kind)), f.Ref)
	switch in {
	case inOpen:
		if !f.Unfinished() {
			return malformed(in, key, "the flag asks nothing of anyone")
		}
	case inFlagAt:
		if !bytes.Equal(at, key) {
			return malformed(in, key, "the flag is of another series, date or kind")
		}
	case inFlags:
		return c.counted(key, row, at)
	}
	return nil
}

// counted looks a flag up in its indexes and counts what they must hold.
func (c *verifier) counted(key []byte, row *flagRow, at []byte) error {
	if row.series != watcher.NoSeries {
		c.flagged++
		if row.series >= c.v.head.names {
			return malformed(inFlags, key, fmt.Sprintf("series %d has no name", row.series))
		}
		if c.v.buckets[inFlagAt].Get(at) == nil {
			return malformed(inFlags, key, "the index of flags does not have it")
		}
	}
	if row.flag.Unfinished() {
		c.open++
		if c.v.buckets[inOpen].Get(key[:8]) == nil {
			return malformed(inFlags, key, "the index of open flags does not have it")
		}
	}
	if row.bits&(flagOwnFile|flagReceived) == 0 {
		return nil
	}
	_, err := c.v.fileRow(row.flag.Step)
	return err
}
