package watcher

import (
	"context"
	"encoding/hex"
	"errors"
	"fmt"

	"strayd/rules"
)

// releasing is a refused file on its way in, because a person said so.
type releasing struct {
	row  FileRow // of its refusal
	flag rules.Flag
	act  rules.Act
	out  *Answer // nil until it is taken
	why  string  // what became of it instead
}

// Release takes a file that was refused because of what is held, on a person's word. Its form is checked as ever. It is taken with its
// entry in the record as one step, or nothing happens. feed may be "" where only one feed refused a file of that name.
func (p *Pass) Release(ctx context.Context, feed, name string, act rules.Act) (*Answer, error) {
	r, err := p.refused(feed, name)
	if err != nil {
		return nil, err
	}
	act.Deed, act.At = rules.Accept, p.Now
	r.act = act
	p.release, p.Released, p.Settled, p.newest = r, map[[32]byte]bool{r.row.File.SHA256: true}, true, rules.NoDate
	p.row = PassRow{Started: p.Now, Ended: p.Now, Feed: r.row.File.Feed, Program: p.Program}
	seen, err := p.begin()
	if err != nil {
		return nil, err
	}
	for _, f := range p.Feeds {
		if f.Name != r.row.File.Feed {
			continue
		}
		if err := p.feed(ctx, f, seen); err != nil {
			return nil, err
		}
	}
	if r.out == nil {
		return nil, fmt.Errorf("%s of feed %s is not taken: %s", name, r.row.File.Feed, r.instead())
	}
	p.Resident.giveBack(p.names)
	return r.out, p.Store.EndPass(p.row)
}

// instead says why a file was not taken.
func (r *releasing) instead() string {
	if r.why == "" {
		return "it is not in the feed's folder"
	}
	return r.why
}

// refused finds the file that was refused, and its flag.
func (p *Pass) refused(feed, name string) (*releasing, error) {
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	r := &releasing{}
	if r.row, err = refusal(v, feed, name); err != nil {
		return nil, err
	}
	takes := func(h FlagHead) bool { return h.Kind == rules.KindRefused && h.Step == r.row.Step }
	err = v.FlagsOf(true, takes, func(f rules.Flag) bool {
		r.flag = f
		return false
	})
	if err == nil && r.flag.Ref == 0 {
		err = fmt.Errorf("the refusal of %s has no flag", name)
	}
	return r, err
}

// refusal is the row of the one file of a name whose newest content was refused.
func refusal(v View, feed, name string) (FileRow, error) {
	newest := map[string]FileRow{} // by feed
	if err := v.Files(func(r FileRow) bool {
		if !r.Fileless() && r.File.Name == name && (feed == "" || feed == r.File.Feed) {
			newest[r.File.Feed] = r
		}
		return true
	}); err != nil {
		return FileRow{}, err
	}
	var found []FileRow
	for _, r := range newest {
		if r.Outcome == Refused {
			found = append(found, r)
		}
	}
	switch {
	case len(newest) == 0:
		return FileRow{}, fmt.Errorf("no file %s was ever read; `strayd flags --kind refused` lists those that were refused", name)
	case len(found) == 0:
		return FileRow{}, fmt.Errorf("%s was taken: nothing is left to release", name)
	case len(found) > 1:
		return FileRow{}, fmt.Errorf("more than one feed refused a file %s: name the one you mean by its path", name)
	}
	return found[0], nil
}

// passes says whether a pass takes a file of a name up.
func (r *releasing) passes(name string) bool { return r == nil || r.row.File.Name == name }

// admits is the error of a file whose content is not the one that was refused.
func (r *releasing) admits(f File) error {
	if r != nil && f.SHA256 != r.row.File.SHA256 {
		return errors.New("its content is not the one that was refused: see `strayd pass`")
	}
	return nil
}

// into enters the release into the step that takes the file.
func (r *releasing) into(p *Pass, b *Batch) error {
	if r == nil {
		return nil
	}
	r.act.Step = b.Step
	f, err := r.flag.After(&r.act, p.today())
	if err != nil {
		return err
	}
	e := rules.Entry{Act: r.act, Refs: []uint64{f.Ref}, Feed: r.row.File.Feed, File: r.row.File.Name, SHA256: hex.EncodeToString(r.row.File.SHA256[:])}
	b.Record = append(b.Record, entryOf(&e))
	b.Flags = append(b.Flags, &FlagRow{Flag: f, SeriesID: NoSeries})
	r.out = &Answer{Entry: e, Flags: []rules.Flag{f}}
	b.Notices = append(b.Notices, p.tellActs(r.out)...)
	return nil
}
