package ledger

import (
	"encoding/binary"
	"io"
)

// pageFreelist is the kind of the page that lists the free ones: its count, or when that is 65535 the u64 after the head, then so
// many page numbers, ascending.
const pageFreelist = 16

// freePages reads the list of free pages with plain reads. bbolt takes it on trust and would write over pages that are in use;
// so what can be told without walking the file is checked each time it is opened: where the list lies, its order and its bounds.
func freePages(f io.ReaderAt, meta boltMeta) ([]uint64, error) {
	w := &pageWalk{f: f, meta: meta, seen: map[uint64]bool{}}
	page, err := w.read(meta.free)
	if err != nil {
		return nil, err
	}
	kind, count := binary.NativeEndian.Uint16(page[8:]), uint64(binary.NativeEndian.Uint16(page[10:]))
	list := page[pageHead:]
	if count == 0xFFFF {
		count, list = binary.NativeEndian.Uint64(list), list[8:]
	}
	if kind != pageFreelist || count > uint64(len(list)/8) {
		return nil, disorder(meta.free, "the list of free pages has kind %d and %d entries", kind, count)
	}
	free := make([]uint64, count)
	last := uint64(1)
	for i := range free {
		free[i] = binary.NativeEndian.Uint64(list[8*i:])
		if free[i] <= last || free[i] >= uint64(meta.pages) {
			return nil, disorder(meta.free, "entry %d of the list of free pages is out of order", i)
		}
		last = free[i]
	}
	return free, nil
}

// checkFree sees to it that every page is either in use or free, and none both.
func (w *pageWalk) checkFree() error {
	free, err := freePages(w.f, w.meta)
	if err != nil {
		return err
	}
	if _, err := w.read(w.meta.free); err != nil {
		return err
	}
	for _, id := range free {
		if w.seen[id] {
			return disorder(id, "it is in use and listed as free")
		}
		w.seen[id] = true
	}
	for id := uint64(2); id < uint64(w.meta.pages); id++ {
		if !w.seen[id] {
			return disorder(id, "it is neither in use nor free")
		}
	}
	return nil
}
