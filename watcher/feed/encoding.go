package feed

import (
	"bufio"
	"bytes"
	"encoding/binary"
	"fmt"
	"io"
	"unicode/utf16"
	"unicode/utf8"
)

var utf8Mark = []byte("\uFEFF")

// decoded turns the declared encoding into UTF-8 without a byte-order mark.
func (p *plan) decoded(src io.Reader) (io.Reader, error) {
	head := make([]byte, 4)
	n, err := io.ReadFull(src, head)
	if err != nil && err != io.EOF && err != io.ErrUnexpectedEOF {
		return nil, err
	}
	head = head[:n]
	whole := func(skip int) io.Reader { return io.MultiReader(bytes.NewReader(head[skip:]), src) }
	wide := utf16Order(head)
	switch p.feed.Encoding {
	case "", "utf-8":
		if wide != nil {
			return nil, refusal("the file is UTF-16; declare encoding: utf-16")
		}
		if bytes.HasPrefix(head, utf8Mark) {
			return whole(len(utf8Mark)), nil
		}
		return whole(0), nil
	case "utf-16":
		if wide == nil {
			return nil, refusal("the file is not UTF-16: it has no byte-order mark and does not begin with an ASCII letter")
		}
		u := &utf16Source{src: bufio.NewReaderSize(whole(markWidth(head)), 1<<16), order: wide, done: int64(markWidth(head))}
		return &decoder{next: u.next}, nil
	case "latin-1":
		if wide != nil || bytes.HasPrefix(head, utf8Mark) {
			return nil, refusal("the file begins with a Unicode byte-order mark; it is not latin-1")
		}
		l := &latinSource{src: bufio.NewReaderSize(whole(0), 1<<16)}
		return &decoder{next: l.next}, nil
	}
	return nil, fmt.Errorf("feed %s: unknown encoding %q", p.feed.Name, p.feed.Encoding)
}

// utf16Order tells UTF-16 by its byte-order mark, or by the zero half of an ASCII first character; nil when it is none.
func utf16Order(head []byte) binary.ByteOrder {
	switch {
	case len(head) < 2:
		return nil
	case head[0] == 0xFF && head[1] == 0xFE, head[0] != 0 && head[0] < 0x80 && head[1] == 0:
		return binary.LittleEndian
	case head[0] == 0xFE && head[1] == 0xFF, head[0] == 0 && head[1] != 0 && head[1] < 0x80:
		return binary.BigEndian
	}
	return nil
}

func markWidth(head []byte) int {
	if head[0] >= 0xFE {
		return 2
	}
	return 0
}

// decoder turns characters from next into UTF-8.
type decoder struct {
	next  func() (rune, error)
	spare []byte // decoded, not yet handed out
}

func (d *decoder) Read(p []byte) (int, error) {
	if len(d.spare) == 0 {
		if err := d.decode(); err != nil {
			return 0, err
		}
	}
	n := copy(p, d.spare)
	d.spare = d.spare[:copy(d.spare, d.spare[n:])]
	return n, nil
}

// decode fills spare with some KiB of text; io.EOF when there is none.
func (d *decoder) decode() error {
	for len(d.spare) < 1<<12 {
		r, err := d.next()
		if err == io.EOF && len(d.spare) > 0 {
			return nil
		}
		if err != nil {
			return err
		}
		d.spare = utf8.AppendRune(d.spare, r)
	}
	return nil
}

// utf16Source decodes UTF-16 strictly (RFC 2781, section 2.2).
type utf16Source struct {
	src   *bufio.Reader
	order binary.ByteOrder
	done  int64
}

func (u *utf16Source) next() (rune, error) {
	first, err := u.unit()
	if err != nil || !utf16.IsSurrogate(rune(first)) {
		return rune(first), err
	}
	second, err := u.unit()
	if err != nil && err != io.EOF {
		return 0, err
	}
	r := utf16.DecodeRune(rune(first), rune(second))
	if r == utf8.RuneError {
		return 0, refusal(fmt.Sprintf("half of a UTF-16 pair stands alone, before byte %d", u.done))
	}
	return r, nil
}

func (u *utf16Source) unit() (uint16, error) {
	var b [2]byte
	n, err := io.ReadFull(u.src, b[:])
	u.done += int64(n)
	if err == io.ErrUnexpectedEOF {
		return 0, refusal("the UTF-16 file is cut off: it has an odd number of bytes")
	}
	return u.order.Uint16(b[:]), err
}

// latinSource decodes ISO 8859-1, whose bytes are the first 256 code points. The control characters 0x80 to 0x9F are refused:
// where they stand, the file is in another encoding.
type latinSource struct {
	src  *bufio.Reader
	done int64
}

func (l *latinSource) next() (rune, error) {
	b, err := l.src.ReadByte()
	if err != nil {
		return 0, err
	}
	l.done++
	if b >= 0x80 && b < 0xA0 {
		return 0, refusal(fmt.Sprintf("byte %d of the file, 0x%X, is no letter of latin-1 (it looks like windows-1252); deliver UTF-8",
			l.done, b))
	}
	return rune(b), nil
}
