package feed

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"strings"
	"syscall"

	"strayd/rules"
	"strayd/watcher"
)

// openFile opens a candidate without waiting for anything and checks that it is the file that was found.
func openFile(c watcher.Candidate) (*os.File, error) {
	root, err := os.OpenRoot(c.Dir)
	if err != nil {
		return nil, err
	}
	defer root.Close()
	file, err := root.OpenFile(c.Name, os.O_RDONLY|syscall.O_NONBLOCK, 0)
	if err != nil {
		if reason := unfit(nil, err); reason != "" && !errors.Is(err, fs.ErrNotExist) {
			return nil, unread(c, reason)
		}
		return nil, err
	}
	info, err := file.Stat()
	if err == nil {
		if reason := unfit(info, nil); reason != "" {
			err = unread(c, reason)
		} else if !same(info, c) {
			err = watcher.ErrChanged
		}
	}
	if err != nil {
		file.Close()
		return nil, err
	}
	return file, nil
}

func same(info fs.FileInfo, c watcher.Candidate) bool {
	return info.Size() == c.Size && info.ModTime().Equal(c.ModTime)
}

// unchanged looks at the open file again.
func unchanged(file *os.File, c watcher.Candidate, read int64) error {
	info, err := file.Stat()
	if err != nil {
		return err
	}
	if !same(info, c) || read != c.Size {
		return watcher.ErrChanged
	}
	return nil
}

// Read reads a file as its feed declares it. New series are added to names in the order of their first appearance, and
// forgotten again when there is an error. Errors: a *watcher.BadFile when the file is refused, watcher.ErrChanged when it must wait,
// else what went wrong in reading, or the feed's declaration.
func Read(ctx context.Context, c watcher.Candidate, f rules.Feed, names *watcher.Names, opt Options) (*watcher.Sheet, error) {
	opt = opt.filled(f.Layout == rules.Wide)
	p, err := newPlan(f, opt)
	if err != nil {
		return nil, err
	}
	file, err := openFile(c)
	if err != nil {
		return nil, err
	}
	defer file.Close()
	if c.Size > opt.Limits.FileBytes {
		return nil, unread(c, fmt.Sprintf("the file has %d bytes, more than the limit of %d", c.Size, opt.Limits.FileBytes))
	}
	held := names.Len()
	m := &merger{plan: p, builder: newBuilder(p.places, p.newest), names: names, newest: rules.NoDate}
	sheet, err := m.sheet(ctx, file, c, opt)
	if err != nil {
		names.Cut(held)
		return nil, err
	}
	sheet.Held = held
	return sheet, nil
}

// sheet reads an open file to its end, whatever it holds: a refusal needs the hash too.
func (m *merger) sheet(ctx context.Context, file *os.File, c watcher.Candidate, opt Options) (*watcher.Sheet, error) {
	d := newDisk(ctx, file, c.Size, opt.Progress)
	s := &splitter{size: opt.chunk, most: opt.Limits.LineBytes}
	if !strings.HasSuffix(c.Name, gzipSuffix) {
		s.size = int(min(int64(s.size), c.Size+1)) // fresh memory is slow: a small file gets a small buffer
	}
	err := m.openGrid(file, c, opt)
	if m.grid != nil {
		defer m.grid.Close() //nolint:errcheck // only read
		s.size = opt.chunk
	}
	if err == nil {
		err = m.read(d, s, c.Name, opt)
	}
	if m.grid != nil && m.gridEnd() {
		err = nil
	}
	if r, ok := err.(refusal); ok && m.bad == nil {
		m.bad = &fault{reason: string(r)}
	} else if err != nil && !ok {
		return nil, err
	}
	if err := d.rest(make([]byte, 1<<16)); err != nil {
		return nil, err
	}
	if err := unchanged(file, c, d.done); err != nil {
		return nil, err
	}
	id := watcher.File{Feed: c.Feed, Name: c.Name, Size: c.Size, SHA256: d.sum()}
	m.skippedTooMany()
	m.checkTrailers()
	if m.bad != nil {
		return nil, m.badFile(id, c.Date)
	}
	sheet := &watcher.Sheet{File: id, What: m.what(), Names: m.names, Columns: m.columns(), Rows: m.rows, Repeated: m.repeated,
		Skipped: m.skipped, Missing: m.missing, Notes: m.notes(c.Name), Terms: watcher.SortTerms(m.terms), Days: !m.wide && m.feed.Columns.Days != "",
		Status: !m.wide && m.feed.Columns.Status != ""}
	if sheet.Unended = s.noLast && !c.Sentinel; sheet.Unended {
		sheet.Notes = append(sheet.Notes, "the last line has no newline: is the file whole?")
	}
	return sheet, nil
}

func (m *merger) badFile(id watcher.File, named rules.Date) *watcher.BadFile {
	bad := &watcher.BadFile{File: id, Date: m.newest}
	m.place(bad, m.bad)
	if bad.Date == rules.NoDate {
		bad.Date = named
	}
	return bad
}

// read takes the header, then everything after it.
func (m *merger) read(d *disk, s *splitter, name string, opt Options) error {
	src, err := m.opened(d, name)
	if err != nil {
		return err
	}
	s.src = src
	first := &chunk{done: make(chan struct{}, 1)}
	for {
		if err := s.next(first); err == io.EOF {
			return refusal("the file is empty")
		} else if err != nil {
			return err
		}
		cur := cursor{text: first.text, sep: m.comma, flat: m.asGrid}
		ok, bad := m.header(&cur, m.names)
		if bad != nil {
			if bad.line += uint32(m.line) + 1; m.grid != nil && m.grid.zero {
				bad.line = 0
			}
			m.bad = bad
			return nil
		}
		if m.line += uint64(cur.line); m.grid != nil && m.grid.zero {
			m.line = 0
		}
		if ok {
			first.text = first.text[cur.at:]
			return m.pipeline(s, first, opt.Workers)
		}
	}
}
