package ledger

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"io"
	"os"
)

// The form of a bbolt page: id u64, kind u16, count u16, overflow u32, then count elements of 16 bytes:
//
//	branch: pos u32, key size u32, child page u64
//	leaf:   flags u32, pos u32, key size u32, value size u32
//
// pos counts from the element itself. A leaf element with flag 1 is a bucket: its value is the root page u64 and a sequence u64,
// and a whole page in the place of a root of its own when the root page is 0.
const (
	pageBranch  = 1
	pageLeaf    = 2
	elementSize = 16
	bucketHead  = 16
)

// pageWalk reads the pages of a file from its root, with plain reads: whatever a damaged page says, it cannot be led out of the
// file, or round in a circle.
type pageWalk struct {
	f    io.ReaderAt
	meta boltMeta
	seen map[uint64]bool
	idle [][]byte
	leaf func(at int64, page []byte, e leafElement) // of each value, where its page lies; may be nil
}

// leafElement is a key and its value, as places in a page.
type leafElement struct{ head, key, value, end int }

// checkPages looks at both head pages and walks every page that is in use. A power cut in the middle of the last commit can leave
// one head page damaged too; that the last change is then missing was never told to anyone.
func checkPages(f *os.File, leaf func(at int64, page []byte, e leafElement)) error {
	meta, _, err := newestMeta(f)
	if err != nil {
		return err
	}
	if !meta.both {
		return &Damaged{Where: "head pages", Why: "one of the two is damaged, and the last change may be missing; the next change mends it"}
	}
	w := &pageWalk{f: f, meta: meta, seen: map[uint64]bool{}, leaf: leaf}
	if err := w.visit(meta.root, nil); err != nil {
		return err
	}
	return w.checkFree()
}

func disorder(id uint64, format string, args ...any) error {
	return &Damaged{Where: fmt.Sprintf("page %d", id), Why: fmt.Sprintf(format, args...)}
}

// visit walks a page and those below it; no key in it is before low.
func (w *pageWalk) visit(id uint64, low []byte) error {
	page, err := w.read(id)
	if err != nil {
		return err
	}
	defer func() { w.idle = append(w.idle, page) }()
	return w.elements(id, int64(id)*w.meta.pageSize, page, low)
}

// read fetches a page with its overflow and notes that it was met.
func (w *pageWalk) read(id uint64) ([]byte, error) {
	var head [pageHead]byte
	if id < 2 || id >= uint64(w.meta.pages) {
		return nil, disorder(id, "there is no such page")
	}
	if _, err := w.f.ReadAt(head[:], int64(id)*w.meta.pageSize); err != nil {
		return nil, disorder(id, "cannot be read: %v", err)
	}
	run := uint64(binary.NativeEndian.Uint32(head[12:])) + 1
	if binary.NativeEndian.Uint64(head[:]) != id || id+run > uint64(w.meta.pages) {
		return nil, disorder(id, "its head says page %d, %d pages long", binary.NativeEndian.Uint64(head[:]), run)
	}
	for i := range run {
		if w.seen[id+i] {
			return nil, disorder(id+i, "it is used twice")
		}
		w.seen[id+i] = true
	}
	page := w.room(int(run) * int(w.meta.pageSize))
	if _, err := w.f.ReadAt(page, int64(id)*w.meta.pageSize); err != nil {
		return nil, disorder(id, "cannot be read: %v", err)
	}
	return page, nil
}

// room is a buffer of n bytes, an earlier one when there is one.
func (w *pageWalk) room(n int) []byte {
	if last := len(w.idle) - 1; last >= 0 {
		b := w.idle[last]
		w.idle = w.idle[:last]
		if cap(b) >= n {
			return b[:n]
		}
	}
	return make([]byte, n)
}

// elements walks the elements of a page that begins at offset at of the file.
func (w *pageWalk) elements(id uint64, at int64, page, low []byte) error {
	kind, count := binary.NativeEndian.Uint16(page[8:]), int(binary.NativeEndian.Uint16(page[10:]))
	if kind != pageBranch && kind != pageLeaf || kind == pageBranch && count == 0 || pageHead+count*elementSize > len(page) {
		return disorder(id, "kind %d with %d elements", kind, count)
	}
	for i := range count {
		e, child := element(page, pageHead+i*elementSize, kind)
		if e.end < 0 {
			return disorder(id, "element %d reaches beyond it", i)
		}
		key := page[e.key:e.value]
		if order := bytes.Compare(low, key); order > 0 || order == 0 && i > 0 {
			return disorder(id, "element %d is out of order", i)
		}
		low = key
		if err := w.element(id, at, page, e, child, kind); err != nil {
			return err
		}
	}
	return nil
}

// element finds out where an element lies; end is -1 when it does not fit into its page.
func element(page []byte, head int, kind uint16) (e leafElement, child uint64) {
	v := page[head:]
	u32 := func(i int) int64 { return int64(binary.NativeEndian.Uint32(v[i:])) }
	pos, keySize, valueSize := u32(0), u32(4), int64(0)
	if kind == pageLeaf {
		pos, keySize, valueSize = u32(4), u32(8), u32(12)
	} else {
		child = binary.NativeEndian.Uint64(v[8:])
	}
	key := int64(head) + pos
	if key+keySize+valueSize > int64(len(page)) {
		return leafElement{end: -1}, 0
	}
	return leafElement{head, int(key), int(key + keySize), int(key + keySize + valueSize)}, child
}

func (w *pageWalk) element(id uint64, at int64, page []byte, e leafElement, child uint64, kind uint16) error {
	if kind == pageBranch {
		return w.visit(child, page[e.key:e.value])
	}
	if binary.NativeEndian.Uint32(page[e.head:])&1 == 0 {
		if w.leaf != nil {
			w.leaf(at, page, e)
		}
		return nil
	}
	value := page[e.value:e.end]
	if len(value) < bucketHead {
		return disorder(id, "a bucket's head is cut short")
	}
	if root := binary.NativeEndian.Uint64(value); root != 0 {
		return w.visit(root, nil)
	}
	if len(value) < bucketHead+pageHead {
		return disorder(id, "a small bucket is cut short")
	}
	return w.elements(id, at+int64(e.value)+bucketHead, value[bucketHead:], nil)
}
