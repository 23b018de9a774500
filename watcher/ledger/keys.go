package ledger

import (
	"encoding/binary"
	"fmt"
	"strconv"

	"strayd/rules"
	"strayd/watcher"
)

// bucket numbers the buckets of the file; bucketNames gives their names there.
type bucket uint8

const (
	inMeta      bucket = iota // identity, head, totals, staging
	inNames                   // chunk | step -> names
	inReturns                 // date | block | step -> column
	inPrices                  // the same
	inUsed                    // range | date | block | step -> cells
	inStates                  // range | block | step -> state
	inScales                  // range | group | date | step -> deviation
	inRanges                  // range -> definition
	inFiles                   // step -> file row
	inFileAt                  // digest of feed, content and feed settings -> step
	inPasses                  // number -> pass row
	inSettings                // number -> text
	inRecord                  // number -> entry, chained
	inFlags                   // ref | step -> flag
	inFlagAt                  // date | series | kind | ref -> nothing
	inOpen                    // ref -> nothing, for flags that ask something of a person
	inOutbox                  // number -> notice
	inOutboxKey               // digest of the dedupe key -> number
	inQueue                   // channel | number -> state, until the notice is sent or withdrawn
	inSlots                   // job -> time up to which its slots are done
	buckets
)

var bucketNames = [buckets]string{"meta", "names", "returns", "prices", "used", "states", "scales", "ranges", "files", "fileat",
	"passes", "settings", "record", "flags", "flagat", "open", "outbox", "outboxkey", "queue", "slots"}

func (b bucket) name() []byte { return []byte(bucketNames[b]) }

func (b bucket) String() string { return bucketNames[b] }

func bucketOf(w watcher.What) bucket {
	if w == watcher.Prices {
		return inPrices
	}
	return inReturns
}

// keySize is the fixed length of a bucket's keys, 0 where it varies.
func (b bucket) keySize() int {
	return [buckets]int{0, 8, 12, 12, 14, 10, 0, 2, 4, 32, 4, 4, 8, 12, 17, 8, 8, 32, 0, 0}[b]
}

// layered says whether the last four bytes of a key are the step that wrote it.
func (b bucket) layered() bool { return b >= inNames && b <= inScales || b == inFlags }

// ordered turns a date into an unsigned number of the same order.
func ordered(d rules.Date) uint32 { return uint32(d) ^ 1<<31 }

func unordered(u uint32) rules.Date { return rules.Date(u ^ 1<<31) }

func put32(k []byte, v uint32) []byte { return binary.BigEndian.AppendUint32(k, v) }

func put16(k []byte, v uint16) []byte { return binary.BigEndian.AppendUint16(k, v) }

func put64(k []byte, v uint64) []byte { return binary.BigEndian.AppendUint64(k, v) }

func get32(k []byte) uint32 { return binary.BigEndian.Uint32(k) }

func get64(k []byte) uint64 { return binary.BigEndian.Uint64(k) }

func columnKey(k []byte, date rules.Date, block, step uint32) []byte {
	return put32(put32(put32(k, ordered(date)), block), step)
}

func usedKey(rangeID uint16, date rules.Date, block, step uint32) []byte {
	return columnKey(put16(make([]byte, 0, 14), rangeID), date, block, step)
}

func stateKey(rangeID uint16, block, step uint32) []byte {
	return put32(put32(put16(make([]byte, 0, 10), rangeID), block), step)
}

// scaleKey holds the group with its length before it, so that no group is the start of another.
func scaleKey(rangeID uint16, group string, date rules.Date, step uint32) []byte {
	return put32(put32(scalePrefix(rangeID, group), ordered(date)), step)
}

func scalePrefix(rangeID uint16, group string) []byte {
	return append(put16(put16(nil, rangeID), uint16(len(group))), group...)
}

func flagKey(ref uint64, step uint32) []byte { return put32(put64(make([]byte, 0, 12), ref), step) }

func flagAtKey(date rules.Date, series uint32, kind byte, ref uint64) []byte {
	return put64(append(put32(put32(make([]byte, 0, 17), ordered(date)), series), kind), ref)
}

// stepOf is the step at the end of a layer's key.
func stepOf(key []byte) uint32 { return get32(key[len(key)-4:]) }

// place says in words which value a key stands for.
func place(b bucket, key []byte) string {
	if n := b.keySize(); n != 0 && len(key) != n {
		return fmt.Sprintf("%s: key of %d bytes %x", b, len(key), key)
	}
	switch b {
	case inMeta:
		return "meta: " + strconv.Quote(string(key))
	case inNames:
		return fmt.Sprintf("names: chunk %d, step %d", get32(key), stepOf(key))
	case inReturns, inPrices:
		return fmt.Sprintf("%s of %s, block %d, step %d", b, unordered(get32(key)), get32(key[4:]), stepOf(key))
	case inUsed:
		return fmt.Sprintf("used values of range %d on %s, block %d, step %d", binary.BigEndian.Uint16(key), unordered(get32(key[2:])),
			get32(key[6:]), stepOf(key))
	case inStates:
		return fmt.Sprintf("state of range %d, block %d, step %d", binary.BigEndian.Uint16(key), get32(key[2:]), stepOf(key))
	}
	return placeOfRow(b, key)
}

func placeOfRow(b bucket, key []byte) string {
	switch b {
	case inRanges:
		return fmt.Sprintf("range %d", binary.BigEndian.Uint16(key))
	case inFiles:
		return fmt.Sprintf("file of step %d", get32(key))
	case inPasses, inSettings:
		return fmt.Sprintf("%s: number %d", b, get32(key))
	case inRecord:
		return fmt.Sprintf("record: entry %d", get64(key))
	case inFlags:
		return fmt.Sprintf("flag %d, step %d", get64(key), stepOf(key))
	case inFlagAt:
		return fmt.Sprintf("index of flags: %s, series %d, flag %d", unordered(get32(key)), get32(key[4:]), get64(key[9:]))
	case inOpen:
		return fmt.Sprintf("index of open flags: flag %d", get64(key))
	case inOutbox:
		return fmt.Sprintf("notice %d", get64(key))
	case inQueue:
		if len(key) >= 10 {
			return fmt.Sprintf("queue of channel %q: notice %d", key[2:len(key)-8], get64(key[len(key)-8:]))
		}
	case inSlots:
		return fmt.Sprintf("slots of job %q", key)
	}
	return fmt.Sprintf("%s: key %x", b, key)
}
