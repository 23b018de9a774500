package desk

import (
	"encoding/json"
	"io"
	"net"
	"os"
	"sync"
)

// inMemory is how much output is kept in memory before it goes to an unnamed file.
const inMemory = 4 << 20

// spool keeps a call's output in order until it is sent.
type spool struct {
	mu   sync.Mutex
	kept []reply
	size int
	file *os.File
}

type spoolEnd struct {
	s   *spool
	err bool
}

func (s *spool) stdout() io.Writer { return spoolEnd{s, false} }
func (s *spool) stderr() io.Writer { return spoolEnd{s, true} }

// Write keeps a copy of p.
func (e spoolEnd) Write(p []byte) (int, error) {
	e.s.mu.Lock()
	defer e.s.mu.Unlock()
	piece := append([]byte(nil), p...)
	r := reply{Out: piece}
	if e.err {
		r = reply{Err: piece}
	}
	e.s.kept = append(e.s.kept, r)
	if e.s.size += len(p); e.s.size > inMemory {
		if err := e.s.spill(); err != nil {
			return 0, err
		}
	}
	return len(p), nil
}

// spill moves what is in memory to the file.
func (s *spool) spill() (err error) {
	if s.file == nil {
		if s.file, err = os.CreateTemp("", "strayd-output-*"); err != nil {
			return err
		}
		if err := os.Remove(s.file.Name()); err != nil {
			return err
		}
	}
	enc := json.NewEncoder(s.file)
	for _, r := range s.kept {
		if err := enc.Encode(r); err != nil {
			return err
		}
	}
	s.kept, s.size = nil, 0
	return nil
}

// send writes everything and the end. A reader may take its time: nothing but the output is held for it.
func (s *spool) send(conn net.Conn, exit int) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.file != nil {
		if _, err := s.file.Seek(0, io.SeekStart); err != nil {
			return err
		}
		if _, err := io.Copy(conn, s.file); err != nil {
			return err
		}
	}
	enc := json.NewEncoder(conn)
	for _, r := range append(s.kept, reply{End: true, Exit: exit}) {
		if err := enc.Encode(r); err != nil {
			return err
		}
	}
	return nil
}

func (s *spool) close() {
	if s.file != nil {
		s.file.Close()
	}
}
