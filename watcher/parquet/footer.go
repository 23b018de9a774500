package parquet

import (
	"encoding/binary"
	"io"
)

// checkFooter holds the description at the end of a file against its own bytes: no text and no list in it may claim more than they hold,
// since the library takes room by such claims. (Thrift compact protocol: kinds of fields, lists and structs.)
func checkFooter(file io.ReaderAt, size, footer int64) error {
	b := make([]byte, footer)
	if _, err := file.ReadAt(b, size-8-footer); err != nil {
		return err
	}
	if _, ok := fits(b, 12, 0, false); !ok {
		return unfit("the Parquet file is damaged: its description claims more than it holds")
	}
	return nil
}

// deepest is how deep structs and lists may lie within each other; those of a Parquet file do so to about seven.
const deepest = 32

// fits steps over a value of a kind. ok is false where there is less than it claims.
func fits(b []byte, kind byte, depth int, listed bool) (rest []byte, ok bool) {
	switch kind {
	case 1, 2: // truth values: within a struct the kind says it all
		return after(b, map[bool]uint64{true: 1}[listed])
	case 3:
		return after(b, 1)
	case 4, 5, 6:
		_, n := binary.Uvarint(b)
		return after(b, uint64(max(n, 0))) // n is 0 or less where it is cut off; what follows then fails, or is the library's to refuse
	case 7:
		return after(b, 8)
	case 8:
		length, n := binary.Uvarint(b)
		if n <= 0 {
			return nil, false
		}
		return after(b[n:], length)
	case 9, 10:
		return listFits(b, depth+1)
	case 12:
		return structFits(b, depth+1)
	}
	return nil, false
}

func after(b []byte, n uint64) ([]byte, bool) {
	if n > uint64(len(b)) {
		return nil, false
	}
	return b[n:], true
}

func listFits(b []byte, depth int) ([]byte, bool) {
	if len(b) == 0 || depth > deepest {
		return nil, false
	}
	kind, size := b[0]&15, uint64(b[0]>>4)
	b = b[1:]
	if size == 15 {
		n := 0
		if size, n = binary.Uvarint(b); n <= 0 {
			return nil, false
		}
		b = b[n:]
	}
	if size > uint64(len(b)) { // every element takes a byte at least
		return nil, false
	}
	ok := true
	for ; size > 0 && ok; size-- {
		b, ok = fits(b, kind, depth, true)
	}
	return b, ok
}

func structFits(b []byte, depth int) ([]byte, bool) {
	for depth <= deepest && len(b) > 0 {
		head := b[0]
		if b = b[1:]; head == 0 {
			return b, true
		}
		if head>>4 == 0 {
			_, n := binary.Uvarint(b)
			if n <= 0 {
				return nil, false
			}
			b = b[n:]
		}
		var ok bool
		if b, ok = fits(b, head&15, depth, false); !ok {
			return nil, false
		}
	}
	return nil, false
}
