package ledger

import (
	"encoding/binary"
	"errors"
	"fmt"
	"hash/fnv"
	"io"
	"io/fs"
	"os"
)

// The head of a bbolt file: two pages, each with 16 bytes of page header, then magic, version, page size, flags (u32 each),
// root page, root sequence, freelist page, high water mark, transaction (u64 each), and the FNV-1a of all that.
const (
	pageHead  = 16
	metaBytes = 64
	boltMagic = 0xED0CDAED
)

// precheck refuses what bbolt would take for a new database, or panic on: no file, an empty one, no regular file, another
// program's file, one that is cut short.
func precheck(path string) error {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return refuse(path, ErrMissing)
	case err != nil:
		return err
	case !info.Mode().IsRegular():
		return &Foreign{path, "it is not a regular file"}
	case info.Size() == 0:
		return refuse(path, ErrEmpty)
	}
	f, err := os.Open(path)
	if err != nil {
		return err
	}
	defer f.Close()
	return checkHead(path, f)
}

func checkHead(path string, f *os.File) error {
	best, known, err := newestMeta(f)
	switch {
	case err != nil:
		return err
	case !known:
		return &Foreign{path, "it does not begin like one"}
	case !best.valid:
		return &Damaged{Path: path, Why: "both head pages are damaged"}
	}
	info, err := f.Stat() // after the head was read: a writer only makes the file longer
	if err != nil {
		return err
	}
	if info.Size()/best.pageSize < best.pages {
		return &Damaged{Path: path, Why: fmt.Sprintf("it is cut short: %d bytes of %d", info.Size(), best.pages*best.pageSize)}
	}
	return nil
}

// checkOpened checks, with the lock held, what bbolt would take on trust.
func (l *Ledger) checkOpened() error {
	meta, _, err := newestMeta(l.file)
	if err == nil {
		_, err = freePages(l.file, meta)
	}
	name(l.path, err)
	return err
}

// newestMeta finds the head page that counts; known says that a head page of bbolt was met, damaged or not.
func newestMeta(f io.ReaderAt) (best boltMeta, known bool, err error) {
	for _, at := range []int64{0, 4096, 8192, 16384, 65536} { // the second lies one page in, whatever the size of a page
		m, err := readMeta(f, at)
		if err != nil {
			return best, known, err
		}
		known = known || m.magic
		if m.valid && (at == 0 || at == m.pageSize) {
			both := best.valid
			if !both || m.tx >= best.tx {
				best = m
			}
			best.both = both
		}
	}
	return best, known, nil
}

// boltMeta is what is needed of a head page.
type boltMeta struct {
	magic, valid    bool
	both            bool // the other head page is valid too
	tx, root, free  uint64
	pageSize, pages int64
}

func readMeta(f io.ReaderAt, at int64) (m boltMeta, err error) {
	var b [pageHead + metaBytes]byte
	if n, err := f.ReadAt(b[:], at); n < len(b) {
		if err == io.EOF {
			err = nil
		}
		return m, err
	}
	v := b[pageHead:]
	m.magic = binary.NativeEndian.Uint32(v) == boltMagic
	sum := fnv.New64a()
	sum.Write(v[:metaBytes-8])
	m.valid = m.magic && binary.NativeEndian.Uint64(v[metaBytes-8:]) == sum.Sum64()
	m.pageSize = int64(binary.NativeEndian.Uint32(v[8:]))
	m.root = binary.NativeEndian.Uint64(v[16:])
	m.free = binary.NativeEndian.Uint64(v[32:])
	m.pages = int64(binary.NativeEndian.Uint64(v[40:]))
	m.tx = binary.NativeEndian.Uint64(v[48:])
	m.valid = m.valid && m.pageSize > 0
	return m, nil
}
