package main

import (
	"cmp"
	"errors"
	"fmt"
	"slices"
	"time"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
	"strayd/watcher/schedule"
)

// knownNames are the series held, then those of files that are only looked at.
type knownNames struct {
	*watcher.Names
	held int
}

// heldNames are the names of the series that the ledger holds. Beside an error they are none.
func heldNames(c *config.Config) (knownNames, error) {
	none := knownNames{Names: watcher.NewNames(nil, nil)}
	l, err := openLedger(c, ledger.ReadOnly)
	if err != nil {
		return none, err
	}
	v, err := l.View()
	if err != nil {
		return none, errors.Join(err, l.Close())
	}
	held, err := v.Names()
	if err == nil {
		held = held.Copy()
	}
	if err = errors.Join(err, v.Close(), l.Close()); err != nil {
		return none, err
	}
	return knownNames{held, held.Len()}, nil
}

// checkFeeds reads every ready file (with settled, every file) without storing it.
func (a *app) checkFeeds(c *config.Config, names knownNames, settled bool) (refused int, err error) {
	now, err := a.now()
	if err != nil {
		return 0, err
	}
	for _, f := range c.Feeds {
		fmt.Fprintf(a.out, "feed %s: %s/%s\n", f.Name, f.Dir, f.Pattern)
		if err := a.sayRuns("  next runs of a daemon:", f.Schedule, c.Location, now); err != nil {
			return refused, err
		}
		found, err := source{}.Find(f, now, settled)
		if err != nil {
			fmt.Fprintf(a.out, "  cannot be looked into: %v\n", err)
			refused++
			continue
		}
		bad, err := a.checkFound(f, found, names.Names, now)
		if err != nil {
			return refused, err
		}
		refused += bad
	}
	return refused, nil
}

// checkFound says of each file of a feed what a pass would make of it, and shows the first rows of the first that it would take.
func (a *app) checkFound(f rules.Feed, found watcher.Found, names *watcher.Names, now time.Time) (refused int, err error) {
	for _, w := range found.Waiting {
		fmt.Fprintf(a.out, "  %s waits: %s\n", printable(w.Name), w.Why)
	}
	for _, bad := range found.Refused {
		fmt.Fprintf(a.out, "  would be refused: %s\n", printable(bad.Error()))
		refused++
	}
	shown := false
	for _, file := range found.Ready {
		sheet, err := source{}.Read(a.ctx, file, f, names, now, nil)
		if err != nil {
			fmt.Fprintf(a.out, "  would be refused: %s\n", printable(err.Error()))
			refused++
			continue
		}
		a.saySheet(sheet)
		if !shown {
			if err := a.sayRows(f, sheet); err != nil {
				return refused, err
			}
			shown = true
		}
	}
	if !shown && refused+len(found.Waiting) == 0 {
		fmt.Fprintln(a.out, "  no file is there yet")
	}
	return refused, nil
}

// sayRuns lists the next runs of a schedule, in its zone.
func (a *app) sayRuns(what, spec string, zone *time.Location, now time.Time) error {
	if spec == "" {
		return nil
	}
	s, err := schedule.Parse(spec, zone)
	if err != nil {
		return err
	}
	fmt.Fprint(a.out, what)
	for _, t := range s.Upcoming(now, 3) {
		fmt.Fprint(a.out, " "+t.In(zone).Format("Mon 2006-01-02 15:04 MST")+";")
	}
	fmt.Fprintln(a.out)
	if w := s.Warning(); w != "" {
		fmt.Fprintln(a.out, "  "+w)
	}
	return nil
}

func (a *app) sayWeekly(c *config.Config) error {
	if c.Weekly == nil {
		return nil
	}
	now, err := a.now()
	if err != nil {
		return err
	}
	return a.sayRuns("weekly log: next runs of a daemon:", c.Weekly.Schedule, c.Location, now)
}

func (a *app) saySheet(s *watcher.Sheet) {
	fmt.Fprintf(a.out, "  %s: %s from %s to %s\n", printable(s.File.Name), rules.Counted(s.Rows, "row"), s.First(), s.Last())
	for _, note := range s.Notes {
		fmt.Fprintf(a.out, "    %s\n", printable(note))
	}
}

// understood is one value of a file as a pass takes it.
type understood struct {
	line   uint32
	date   rules.Date
	series string
	value  int64
}

// rowsShown is how many rows of a file are shown as they are understood.
const rowsShown = 3

// sayRows shows the first rows of a file: each value in the unit of the file, and as the fraction that is judged.
func (a *app) sayRows(f rules.Feed, s *watcher.Sheet) error {
	w := columns(a.out)
	fields(w, "    line", "date", "series", "in the file", "understood as")
	for _, r := range firstRows(s, rowsShown) {
		in, as := inUnit(r.value, f.Unit), rules.Units(r.value).String()
		if s.What == watcher.Prices {
			in, as = rules.Price(r.value).String(), "a price"
		}
		fields(w, fmt.Sprintf("    %d", r.line), day(r.date), printable(r.series), in, as)
	}
	return w.Flush()
}

// firstRows are the first values of a sheet in the order of the file.
func firstRows(s *watcher.Sheet, most int) []understood {
	var first []understood
	vals := make([]int64, watcher.BlockSize)
	for _, col := range s.Columns {
		col.Fill(vals[:col.Len()], 0, s.What.Places())
		for i, v := range vals[:col.Len()] {
			line := col.Line(i)
			if v == watcher.Missing64 || len(first) == most && line >= first[most-1].line {
				continue
			}
			id := col.Block*watcher.BlockSize + uint32(i)
			first = append(first, understood{line, col.Date, string(s.Names.Name(id)), v})
			slices.SortStableFunc(first, func(a, b understood) int { return cmp.Compare(a.line, b.line) })
			first = first[:min(most, len(first))]
		}
	}
	return first
}

// inUnit writes a return as its feed does: 1.25 % or 125 bp, or the fraction itself.
func inUnit(value int64, u rules.Unit) string {
	s := rules.Decimal(value, rules.Places-u.Decimals())
	switch u {
	case rules.Percent:
		return s + " %"
	case rules.BP:
		return s + " bp"
	}
	return s
}
