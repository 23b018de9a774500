package ledger

import (
	"crypto/sha256"

	"strayd/rules"
	"strayd/watcher"
)

func counts(c *watcher.Counts) []*int {
	return []*int{&c.Rows, &c.New, &c.Late, &c.Restated, &c.Same, &c.Inside, &c.Watch, &c.Breach, &c.NotJudged, &c.Flags, &c.Provisional}
}

func (p *packer) counts(c watcher.Counts) {
	for _, v := range counts(&c) {
		p.int(int64(*v))
	}
}

func (u *unpacker) counts(c *watcher.Counts) {
	for _, v := range counts(c) {
		*v = int(u.int())
	}
}

// outcomes are numbered in the order of this list: only append.
func outcomes() []watcher.Outcome {
	return []watcher.Outcome{watcher.Accepted, watcher.Refused, watcher.Changed, watcher.Overdue, watcher.Acted, watcher.Lapsed,
		watcher.Checked}
}

func packFile(dst []byte, f *watcher.FileRow) []byte {
	p := packer{dst}
	p.text(f.File.Feed)
	p.text(f.File.Name)
	p.int(f.File.Size)
	p.raw(f.File.SHA256[:])
	p.text(f.Stamp)
	p.text(f.FeedKey)
	p.uint(uint64(f.Settings))
	p.byte(byte(indexOf(outcomes(), f.Outcome)))
	p.time(f.Received)
	p.text(f.Reason)
	p.uint(uint64(f.Line))
	p.int(int64(f.First))
	p.int(int64(f.Last))
	p.counts(f.Counts)
	return p.b
}

// notListed is what indexOf gives for a value that is not in the list.
const notListed = 255

// indexOf is the place of v in list.
func indexOf[T comparable](list []T, v T) int {
	for i := range list {
		if list[i] == v {
			return i
		}
	}
	return notListed
}

func unpackFile(v []byte) (f watcher.FileRow, ok bool) {
	u := unpacker{b: v}
	f.File.Feed = u.text()
	f.File.Name = u.text()
	f.File.Size = u.int()
	copy(f.File.SHA256[:], u.raw(len(f.File.SHA256)))
	f.Stamp = u.text()
	f.FeedKey = u.text()
	f.Settings = uint32(u.uint())
	outcome := int(u.byte())
	f.Received = u.time()
	f.Reason = u.text()
	f.Line = uint32(u.uint())
	f.First = rules.Date(u.int())
	f.Last = rules.Date(u.int())
	u.counts(&f.Counts)
	if outcome >= len(outcomes()) {
		return f, false
	}
	f.Outcome = outcomes()[outcome]
	return f, u.whole()
}

// fileDigest is the key under which a file's content is found again: the SHA-256 of feed, content hash and feed settings.
func fileDigest(feed string, sha [32]byte, feedKey string) []byte {
	var p packer
	p.text(feed)
	p.raw(sha[:])
	p.text(feedKey)
	sum := sha256.Sum256(p.b)
	return sum[:]
}

func packPass(dst []byte, r *watcher.PassRow) []byte {
	p := packer{dst}
	p.time(r.Started)
	p.time(r.Ended)
	p.text(r.Feed)
	p.int(int64(r.Accepted))
	p.int(int64(r.Refused))
	p.int(int64(r.Waiting))
	p.counts(r.Counts)
	p.text(r.Failed)
	p.text(r.Program)
	return p.b
}

func unpackPass(v []byte) (r watcher.PassRow, ok bool) {
	u := unpacker{b: v}
	r.Started = u.time()
	r.Ended = u.time()
	r.Feed = u.text()
	r.Accepted = int(u.int())
	r.Refused = int(u.int())
	r.Waiting = int(u.int())
	u.counts(&r.Counts)
	r.Failed = u.text()
	r.Program = u.text()
	return r, u.whole()
}

// Entry is an entry of the record with its place in the chain.
type Entry struct {
	Number uint64
	watcher.RecordEntry
	Prev, Hash [32]byte
}

// link is the hash of an entry: the SHA-256 over its number, the hash before it, kind, who, time (nanoseconds since 1970) and
// body, each text with its length before it as a varint.
func (e *Entry) link() [32]byte {
	var p packer
	p.uint(e.Number)
	p.raw(e.Prev[:])
	p.text(e.Kind)
	p.text(e.Who)
	p.time(e.At)
	p.text(string(e.Body))
	return sha256.Sum256(p.b)
}

func packEntry(dst []byte, e *Entry) []byte {
	p := packer{dst}
	p.raw(e.Prev[:])
	p.raw(e.Hash[:])
	p.text(e.Kind)
	p.text(e.Who)
	p.time(e.At)
	p.text(string(e.Body))
	return p.b
}

func unpackEntry(number uint64, v []byte) (e Entry, ok bool) {
	u := unpacker{b: v}
	e.Number = number
	copy(e.Prev[:], u.raw(32))
	copy(e.Hash[:], u.raw(32))
	e.Kind = u.text()
	e.Who = u.text()
	e.At = u.time()
	e.Body = []byte(u.text())
	return e, u.whole()
}
