package page

import (
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// dayFacts are what the first page reads from the ledger.
type dayFacts struct {
	flags   []rules.Flag // that ask something
	feeds   map[string]*arrival
	newest  rules.Date // on which anything is held, of those taken last
	checked int
	due     int
	missing []string
	head    string
}

// arrival is what came of one feed lately.
type arrival struct {
	file    watcher.FileRow // the last accepted
	refused int             // since the start of the day
}

// read gives what the page needs of the ledger, or gives what was read at the same step.
func (t *today) read(v watcher.View, day rules.Date, since time.Time) (*dayFacts, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	if t.held != nil && t.step == v.Step() && t.day == day {
		return t.held, nil
	}
	f := &dayFacts{feeds: map[string]*arrival{}, newest: rules.NoDate}
	if err := v.Flags(false, func(g rules.Flag) bool {
		if g.AsksOn(day) {
			f.flags = append(f.flags, g)
		}
		return true
	}); err != nil {
		return nil, err
	}
	if err := v.Files(func(row watcher.FileRow) bool { f.arrive(row, since); return true }); err != nil {
		return nil, err
	}
	var err error
	if f.newest != rules.NoDate {
		if f.checked, f.due, f.missing, err = watcher.Day(v, f.newest); err != nil {
			return nil, err
		}
	}
	if f.head, err = v.Head(); err != nil {
		return nil, err
	}
	t.held, t.step, t.day = f, v.Step(), day
	return f, nil
}

func (f *dayFacts) arrive(row watcher.FileRow, since time.Time) {
	if row.Fileless() {
		return
	}
	a := f.feeds[row.File.Feed]
	if a == nil {
		a = &arrival{}
		f.feeds[row.File.Feed] = a
	}
	a.take(row, since)
	if row.Outcome == watcher.Accepted {
		f.newest = max(f.newest, row.Last)
	}
}

// take notes a file; since is the start of the day.
func (a *arrival) take(row watcher.FileRow, since time.Time) {
	switch {
	case row.Outcome == watcher.Accepted:
		a.file = row
	case !row.Received.Before(since):
		a.refused++
	}
}

func startOf(t time.Time) time.Time {
	y, m, d := t.Date()
	return time.Date(y, m, d, 0, 0, 0, 0, t.Location())
}
