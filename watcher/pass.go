package watcher

import (
	"context"
	"errors"
	"fmt"
	"time"

	"strayd/rules"
	"strayd/rules/causes"
)

// Pass is one run over one or all feeds. Fill in the fields and call Run once.
type Pass struct {
	Store    Store
	Source   Source
	Settings rules.Settings
	Feeds    []rules.Feed
	FeedKey  func(rules.Feed) string // hash of what decides how a feed's files are read
	Now      time.Time
	Zone     *time.Location // of the day on which waivers end; nil for UTC
	Settled  bool           // take the person's word that every file is whole
	Only     string         // the one feed to take; "" for all
	Who      string         // who acts, for the record
	Program  string         // version of the program
	Workers  int            // goroutines that judge; 0 for one a processor

	// Resident is what the passes before it left in memory; nil to read everything from the ledger.
	Resident *Resident
	// Released are the contents of refused files that a person released: what is held is not held against them. Their form is.
	Released map[[32]byte]bool

	// Tell makes the notices of a step, which are recorded with it; nil for none.
	Tell func(rules.News) []rules.Notice
	// TellActs makes the updates of what somebody did about flags; nil for none.
	TellActs func(rules.ActNews) []rules.Notice
	// Report is told of every file as it is done with; nil for nobody.
	Report func(FileReport)
	// Progress is told of long work by its name; nil for nobody.
	Progress func(work string, done, total int64)

	names      *Names               // those held
	firstNames int                  // how many were held when the pass began
	newest     rules.Date           // newest date of the files taken so far
	opened     []*FlagRow           // open flags of first loads, which become history when a newer date comes in
	gateText   string               // see gateKey
	taken      map[string][]FileRow // the newest accepted files of each feed that brought something new, in their order
	row        PassRow
	slow       slowPast     // of the weeks checked before
	release    *releasing   // the one file to take, because a person released it; nil for all
	led        *leader      // that of the step before
	again      *weighedOnce // of a back-run, else nil
	stopped    func() error // says why a back-run is to end, else nil

	newWeigher func([]causes.Member, []string, float64) weigher // nil for the real one
}

// Follow lets the pass go on from what another one over the same ledger had in memory, where that still holds: it saves time and changes no
// verdict. nil is nobody.
func (p *Pass) Follow(before *Pass) {
	if before != nil {
		p.led = before.led
	}
}

// FileReport is what became of one file in a pass.
type FileReport struct {
	Feed, Name string
	Fate       Fate
	Why        string
	Row        FileRow
	Notes      []string
}

// Fate is a file's part in a pass.
type Fate string

const (
	FateAccepted Fate = "accepted"
	FateRefused  Fate = "refused"
	FateWaiting  Fate = "waiting"
	FateChecked  Fate = "checked" // not a file: the slow-burn checks of a week, in Why
	FateSeen     Fate = "seen"    // the same content under the same settings: nothing happens
)

// Run takes every ready file as one step each and adds a row to the run record. Files that are refused do not stop it: they are
// counted in the row. An error means that the pass could not go on; steps published before it stand.
func (p *Pass) Run(ctx context.Context) (PassRow, error) {
	p.row = PassRow{Started: p.Now, Feed: p.Only, Program: p.Program}
	p.newest = rules.NoDate
	err := p.run(ctx)
	if err != nil {
		p.row.Failed = err.Error()
	}
	p.row.Ended = p.Now
	return p.row, errors.Join(err, p.Store.EndPass(p.row))
}

func (p *Pass) run(ctx context.Context) error {
	if err := p.lapse(); err != nil {
		return err
	}
	seen, err := p.begin()
	if err != nil {
		return err
	}
	feeds, err := p.inOrder()
	if err != nil {
		return err
	}
	for _, f := range feeds {
		if p.Only != "" && f.Name != p.Only {
			continue
		}
		if err := p.feed(ctx, f, seen); err != nil {
			return fmt.Errorf("feed %s: %w", f.Name, err)
		}
	}
	if p.release == nil {
		if err := p.slowBurn(ctx); err != nil {
			return fmt.Errorf("slow-burn checks: %w", err)
		}
	}
	p.Resident.giveBack(p.names)
	return nil
}

// seenFiles knows the files that were taken before, by stamp, and the sizes that have occurred.
type seenFiles struct {
	stamps map[string]bool
	sizes  map[int64]bool
}

func stampKey(feed, name, stamp, feedKey string) string {
	return feed + "\x00" + name + "\x00" + stamp + "\x00" + feedKey
}

func (p *Pass) begin() (*seenFiles, error) {
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	names := p.Resident.lend(v.Step())
	if names == nil {
		if names, err = v.Names(); err != nil {
			return nil, err
		}
		names = names.Copy()
	}
	p.names, p.firstNames = names, names.Len()
	s := &seenFiles{map[string]bool{}, map[int64]bool{}}
	p.slow = slowPast{began: p.Now}
	p.taken, p.gateText = map[string][]FileRow{}, gateText(&p.Settings)
	return s, v.Files(func(r FileRow) bool {
		s.stamps[stampKey(r.File.Feed, r.File.Name, r.Stamp, r.FeedKey)] = !p.Released[r.File.SHA256] || r.Outcome != Refused
		s.sizes[r.File.Size] = true
		p.noteTaken(r)
		p.slow.note(r)
		return true
	})
}

func (p *Pass) feed(ctx context.Context, f rules.Feed, seen *seenFiles) error {
	found, err := p.Source.Find(f, p.Now, p.Settled)
	if err != nil {
		return err
	}
	for _, w := range found.Waiting {
		if !p.release.passes(w.Name) {
			continue
		}
		p.row.Waiting++
		p.report(FileReport{Feed: f.Name, Name: w.Name, Fate: FateWaiting, Why: w.Why})
	}
	for _, bad := range found.Refused {
		if p.release != nil {
			continue
		}
		bad.File.Feed = f.Name
		if err := p.refuse(bad, f, Candidate{Name: bad.File.Name}); err != nil {
			return err
		}
	}
	for _, c := range found.Ready {
		if err := ctx.Err(); err != nil {
			return err
		}
		if !p.release.passes(c.Name) {
			continue
		}
		if err := p.unread(f, c, p.file(ctx, f, c, seen)); err != nil {
			return fmt.Errorf("%s: %w", c.Name, err)
		}
	}
	return nil
}

// unreadable is an error of reading a file, as against one of the ledger.
type unreadable struct{ error }

func (u unreadable) Unwrap() error { return u.error }

// unread takes the errors of files that could not be read: one that is refused raises its flag, one that is still being
// written waits, and none stops the others.
func (p *Pass) unread(f rules.Feed, c Candidate, err error) error {
	var u unreadable
	if !errors.As(err, &u) {
		return err
	}
	var bad *BadFile
	if errors.As(u, &bad) {
		bad.File.Feed = f.Name
		return p.refuse(bad, f, c)
	}
	report := FileReport{Feed: f.Name, Name: c.Name, Fate: FateWaiting, Why: "it changes while it is read"}
	if errors.Is(u, ErrChanged) {
		p.row.Waiting++
	} else {
		p.row.Refused++
		report.Fate, report.Why = FateRefused, fmt.Sprintf("%s: cannot be read: %v", c.Name, u.error)
	}
	p.report(report)
	return nil
}

// file takes one file: nothing happens when it was taken before, a bad one is refused, and the rest is judged and published.
func (p *Pass) file(ctx context.Context, f rules.Feed, c Candidate, seen *seenFiles) error {
	key := p.FeedKey(f)
	if c.Stamp != "" && (seen.stamps[stampKey(f.Name, c.Name, c.Stamp, key)] || seen.stamps[stampKey(f.Name, c.Name, c.Stamp, p.gateKey(f))]) {
		p.report(FileReport{Feed: f.Name, Name: c.Name, Fate: FateSeen})
		return nil
	}
	held := p.names.Len()
	sheet, err := p.Source.Read(ctx, c, f, p.names, p.Now, p.progress("reading "+c.Name))
	if ctx.Err() != nil {
		return ctx.Err()
	}
	if err != nil {
		p.names.Cut(held)
		return unreadable{err}
	}
	sheet.File.Feed = f.Name
	if seen.sizes[sheet.File.Size] { // only content of a size that has occurred can have been taken before, under another name
		known, err := p.known(f, sheet.File.SHA256, key)
		if known || err != nil {
			p.names.Cut(held)
			p.report(FileReport{Feed: f.Name, Name: c.Name, Fate: FateSeen})
			return err
		}
	}
	seen.sizes[sheet.File.Size] = true
	if err = p.accept(sheet, f, c); err != nil {
		p.names.Cut(held)
	}
	var bad *BadFile
	if errors.As(err, &bad) {
		return p.refuse(bad, f, c)
	}
	return err
}

func (p *Pass) known(f rules.Feed, sha [32]byte, key string) (bool, error) {
	v, err := p.Store.View()
	if err != nil {
		return false, err
	}
	defer v.Close()
	_, ok, err := v.FileSeen(f.Name, sha, key)
	if ok || err != nil || p.Released[sha] {
		return ok, err
	}
	_, ok, err = v.FileSeen(f.Name, sha, p.gateKey(f))
	return ok, err
}

// refuse records a file that changes nothing, with the one flag that it raises.
func (p *Pass) refuse(bad *BadFile, f rules.Feed, c Candidate) error {
	if p.release != nil {
		p.release.why = "its form is checked as ever: " + bad.Error()
		return nil
	}
	if known, err := p.known(f, bad.File.SHA256, p.FeedKey(f)); known || err != nil {
		p.report(FileReport{Feed: f.Name, Name: bad.File.Name, Fate: FateSeen})
		return err
	}
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	b := &Batch{Step: v.Step() + 1}
	ref := v.NextRef()
	if err := v.Close(); err != nil {
		return err
	}
	key := p.FeedKey(f)
	if bad.Gate {
		key = p.gateKey(f)
	}
	b.File = FileRow{Step: b.Step, File: bad.File, Stamp: c.Stamp, FeedKey: key, Outcome: Refused, Received: p.Now,
		Reason: bad.Error(), Line: uint32(bad.Line), First: bad.Date, Last: bad.Date, Counts: Counts{Flags: 1}}
	flag := &FlagRow{SeriesID: NoSeries, New: true}
	flag.Ref, flag.Step, flag.RaisedAt, flag.Date = ref, b.Step, p.Now, bad.Date
	flag.Kind, flag.Standing, flag.Return = rules.KindRefused, rules.Open, rules.Missing
	flag.Feed, flag.File, flag.Line, flag.Note = f.Name, bad.File.Name, uint32(bad.Line), bad.Note()
	flag.LooksLike = bad.LooksLike
	b.Flags = []*FlagRow{flag}
	p.tell(b, 0)
	if err := p.Store.Publish(b); err != nil {
		return err
	}
	p.Resident.passed(b.Step)
	p.row.Refused++
	p.row.Counts.Add(b.File.Counts)
	p.report(FileReport{Feed: f.Name, Name: bad.File.Name, Fate: FateRefused, Why: bad.Error(), Row: b.File})
	return nil
}

func (p *Pass) report(r FileReport) {
	if p.release != nil {
		p.release.why = r.Why
	}
	if p.Report != nil {
		p.Report(r)
	}
}

func (p *Pass) progress(work string) Progress {
	if p.Progress == nil {
		return nil
	}
	return func(done, total int64) { p.Progress(work, done, total) }
}
