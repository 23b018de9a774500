package ledger

import (
	"fmt"

	bolt "go.etcd.io/bbolt"

	"strayd/rules"
	"strayd/watcher"
)

// flag decodes a flag whole: the series' name, and what stands in the file row of the step that raised it.
func (v *View) flag(key, value []byte) (f rules.Flag, err error) {
	body, err := checked(inFlags, key, value)
	if err != nil {
		return f, err
	}
	row, ok := unpackFlag(get64(key), body)
	if !ok {
		return f, malformed(inFlags, key, "it cannot be read")
	}
	f = row.flag
	if row.bits&(flagOwnFile|flagReceived) != 0 {
		if v.file.Step != f.Step {
			if v.file, err = v.fileRow(f.Step); err != nil {
				return f, err
			}
		}
		if row.bits&flagOwnFile != 0 {
			f.Feed, f.File = v.file.File.Feed, v.file.File.Name
		}
		if row.bits&flagReceived != 0 {
			f.RaisedAt = v.file.Received
		}
	}
	if row.series != watcher.NoSeries {
		f.Series, err = v.name(row.series)
	}
	return f, err
}

// flagHead reads the front of a flag.
func flagHead(key, value []byte) (h watcher.FlagHead, err error) {
	body, err := checked(inFlags, key, value)
	if err != nil {
		return h, err
	}
	u := unpacker{b: body}
	row, ok := unpackFront(&u)
	if !ok || u.bad {
		return h, malformed(inFlags, key, "it cannot be read")
	}
	f := &row.flag
	return watcher.FlagHead{Kind: f.Kind, Standing: f.Standing, Step: f.Step, Date: f.Date, SeriesID: row.series}, nil
}

// namePart is a chunk of names with where each stops.
type namePart struct {
	text []byte // in the map
	ends []uint32
}

// name is the name of one series, without loading all.
func (v *View) name(id uint32) (string, error) {
	if all := v.l.names.Load(); all != nil {
		if name := all.Name(id); name != nil {
			return string(name), nil
		}
	}
	c := id / watcher.BlockSize
	part, ok := v.chunks[c]
	if !ok {
		list, err := v.chunk(c)
		if err != nil {
			return "", err
		}
		part = namePart{list.text, list.appendEnds(make([]uint32, 0, list.n), 0)}
		v.chunks[c] = part
	}
	at := int(id % watcher.BlockSize)
	if at >= len(part.ends) {
		return "", malformed(inNames, put32(put32(nil, c), v.whole), fmt.Sprintf("series %d has no name", id))
	}
	from := uint32(0)
	if at > 0 {
		from = part.ends[at-1]
	}
	return string(part.text[from:part.ends[at]]), nil
}

// chunk is the published form of one chunk of names.
func (v *View) chunk(c uint32) (chunk, error) {
	key, value := newest(v.cursors[inNames], put32(nil, c), v.whole)
	if key == nil {
		return chunk{}, malformed(inNames, put32(put32(nil, c), v.whole), "it is not there")
	}
	body, err := opened(inNames, key, value)
	if err != nil {
		return chunk{}, err
	}
	list, ok := parseChunk(body)
	if want := min(watcher.BlockSize, int(v.head.names)-int(c)*watcher.BlockSize); !ok || list.n != want {
		return list, malformed(inNames, key, "it does not hold as many names as it should")
	}
	return list, nil
}

// Names gives the dictionary of series. It is loaded once for all readings until there are more names, so nobody may add to it.
func (v *View) Names() (n *watcher.Names, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	if n = v.l.names.Load(); n != nil && n.Len() == int(v.head.names) {
		return n, nil
	}
	var parts []chunk
	size := 0
	for c := uint32(0); c*watcher.BlockSize < v.head.names; c++ {
		p, err := v.chunk(c)
		if err != nil {
			return nil, err
		}
		parts = append(parts, p)
		size += len(p.text)
	}
	text, ends := make([]byte, 0, size), make([]uint32, 0, v.head.names)
	for _, p := range parts {
		ends = p.appendEnds(ends, uint32(len(text)))
		text = append(text, p.text...)
	}
	n = watcher.NewNames(text, ends)
	v.l.names.Store(n)
	return n, nil
}

// Flags calls each with every flag by ref, or only with those that are unfinished, until it returns false.
func (v *View) Flags(all bool, each func(rules.Flag) bool) error {
	return v.FlagsOf(all, nil, each)
}

// FlagsOf is Flags for those that takes is true of; nil takes all.
func (v *View) FlagsOf(all bool, takes func(watcher.FlagHead) bool, each func(rules.Flag) bool) error {
	in := inOpen
	if all {
		in = inFlags
	}
	if v.tx == nil {
		return errDone
	}
	scan := flagScan{v: v, in: in, c: v.buckets[in].Cursor(), rows: rowCursor{c: v.buckets[inFlags].Cursor()}, takes: takes}
	for {
		f, ok, err := scan.next()
		if err != nil || !ok || !each(f) {
			return err
		}
	}
}

// flagScan walks flags by ref, with cursors of its own, so that other questions may be asked meanwhile.
type flagScan struct {
	v     *View
	in    bucket
	c     *bolt.Cursor
	rows  rowCursor
	begun bool
	ref   uint64 // of the last one
	takes func(watcher.FlagHead) bool
}

// next finds the next flag that is asked for. It stands by itself so that a panic in the caller's function is not taken for damage.
func (s *flagScan) next() (f rules.Flag, ok bool, err error) {
	v := s.v
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return f, false, err
	}
	for k, value := s.step(); k != nil; k, value = s.step() {
		if _, err := checked(s.in, k, value); err != nil {
			return f, false, err
		}
		key, row := s.rows.newest(k[:8], v.head.step)
		switch {
		case key == nil && s.in == inOpen:
			return f, false, malformed(inOpen, k, fmt.Sprintf("flag %d is not there", get64(k)))
		case key == nil:
			continue
		}
		if s.takes != nil {
			head, err := flagHead(key, row)
			if err != nil {
				return f, false, err
			}
			if !s.takes(head) {
				continue
			}
		}
		f, err = v.flag(key, row)
		return f, err == nil, err
	}
	return f, false, nil
}

// step moves to the next ref, past the other layers of the one before.
func (s *flagScan) step() (k, value []byte) {
	if s.begun {
		k, value = s.c.Next()
	} else {
		k, value = s.c.First()
	}
	for s.begun && k != nil && get64(k) == s.ref {
		k, value = s.c.Next()
	}
	if k != nil {
		s.begun, s.ref = true, get64(k)
	}
	return k, value
}

// FlagAt finds the flag of a series, date and kind; of several, the newest.
func (v *View) FlagAt(series uint32, date rules.Date, kind rules.Kind) (f rules.Flag, ok bool, err error) {
	number := indexOf(rules.Kinds, kind)
	if number == notListed {
		return f, false, nil
	}
	ref := uint64(0)
	prefix := flagAtKey(date, series, byte(number), 0)[:9]
	err = v.walk(inFlagAt, prefix, func(k, _ []byte) (bool, error) {
		ref = get64(k[9:])
		return true, nil
	})
	if err != nil || ref == 0 {
		return f, false, err
	}
	return v.Flag(ref)
}

// Flag finds a flag by its ref.
func (v *View) Flag(ref uint64) (f rules.Flag, ok bool, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return f, false, err
	}
	key, value := newest(v.cursors[inFlags], put64(nil, ref), v.head.step)
	if key == nil {
		return f, false, nil
	}
	f, err = v.flag(key, value)
	return f, err == nil, err
}

// FlagPast is a flag as it stood after each step that changed it, oldest first.
func (v *View) FlagPast(ref uint64) (list []watcher.FlagVersion, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	err = v.each(inFlags, put64(nil, ref), func(k, _ []byte) (bool, error) {
		f, err := v.flag(k, v.buckets[inFlags].Get(k))
		list = append(list, watcher.FlagVersion{Step: stepOf(k), Flag: f})
		return true, err
	})
	return list, err
}
