package feed

import (
	"bytes"
	"io"
)

// splitter cuts a stream of text into chunks of whole records.
type splitter struct {
	src    io.Reader
	size   int    // bytes a chunk, more where a record is longer
	most   int    // bytes a record
	rest   []byte // begun, not yet handed out
	out    int64  // bytes handed out
	ended  bool
	noLast bool // the last line had no newline
}

// next fills a chunk. It returns io.EOF when nothing is left. A record longer than the bound comes as it is so far, and is the
// last.
func (s *splitter) next(c *chunk) error {
	c.reset()
	if s.ended && len(s.rest) == 0 {
		return io.EOF
	}
	buf := append(c.buf[:0], s.rest...)
	s.rest = s.rest[:0]
	want := s.size
	for {
		var err error
		if buf, err = s.fill(buf, want); err != nil {
			c.buf = buf
			return err
		}
		if len(buf) == 0 {
			return io.EOF
		}
		cut := lastRecordEnd(buf)
		switch {
		case cut > 0 && !s.ended:
			s.rest = append(s.rest, buf[cut:]...)
			buf = buf[:cut]
		case s.ended || len(buf) > s.most+2:
			if buf[len(buf)-1] != '\n' {
				s.noLast = true
				buf = append(buf, '\n')
			}
			s.ended = true
		default:
			want = 2 * len(buf)
			continue
		}
		c.buf, c.text, c.at = buf, buf, s.out
		s.out += int64(len(buf))
		return nil
	}
}

// fill reads until there are want bytes, or the end.
func (s *splitter) fill(buf []byte, want int) ([]byte, error) {
	if cap(buf) < want+1 { // one for a newline to be added
		buf = append(make([]byte, 0, want+1), buf...)
	}
	for len(buf) < want && !s.ended {
		n, err := s.src.Read(buf[len(buf):want])
		buf = buf[:len(buf)+n]
		if err == io.EOF {
			s.ended = true
		} else if err != nil {
			return buf, err
		}
	}
	return buf, nil
}

// lastRecordEnd is the place after the last newline outside quotes, 0 when there is none. text begins with a record. A record
// has an even number of quotes (RFC 4180: a quote within a quoted cell is doubled).
func lastRecordEnd(text []byte) int {
	end := bytes.LastIndexByte(text, '\n') + 1
	if end == 0 || bytes.IndexByte(text[:end], '"') < 0 {
		return end
	}
	quotes := bytes.Count(text[:end], []byte{'"'})
	for end > 0 && quotes%2 == 1 {
		before := bytes.LastIndexByte(text[:end-1], '\n') + 1
		quotes -= bytes.Count(text[before:end], []byte{'"'})
		end = before
	}
	return end
}
