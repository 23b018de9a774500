package watcher

import (
	"maps"
	"slices"
	"time"

	"strayd/rules"
)

// lookBack is how many held dates a feed's date before is looked for.
const lookBack = 20

// Deadline judges whether a feed was whole for a valuation date that has fallen due, and raises one late flag when it was not.
func (p *Pass) Deadline(f rules.Feed, date rules.Date, due time.Time) error {
	v, err := p.Store.View()
	if err != nil {
		return err
	}
	b, err := p.lateStep(v, f, date, due)
	if closeErr := v.Close(); err == nil {
		err = closeErr
	}
	if err != nil || b == nil {
		return err
	}
	p.tell(b, 0)
	if err := p.Store.Publish(b); err != nil {
		return err
	}
	p.Resident.passed(b.Step)
	return nil
}

// lateStep is the step that raises a late flag; nil when the feed is whole, or when the flag is there already.
func (p *Pass) lateStep(v View, f rules.Feed, date rules.Date, due time.Time) (*Batch, error) {
	a, err := arrival(v, &p.Settings, f.Name, date)
	if err != nil || a == nil {
		return nil, err
	}
	a.Due = due
	flag, late := a.Flag(p.Now)
	if !late {
		return nil, nil
	}
	raised := false
	takes := func(h FlagHead) bool { return h.Date == date }
	if err := v.FlagsOf(true, takes, func(g rules.Flag) bool {
		raised = g.Feed == f.Name && tells(&g)
		return !raised
	}); err != nil || raised {
		return nil, err
	}
	b := &Batch{Step: v.Step() + 1}
	flag.Ref, flag.Step = v.NextRef(), b.Step
	b.File = FileRow{Step: b.Step, Outcome: Overdue, Received: p.Now, First: date, Last: date, Counts: Counts{Flags: 1}}
	b.File.File.Feed = f.Name
	b.Flags = []*FlagRow{{Flag: flag, SeriesID: NoSeries, New: true}}
	return b, nil
}

// tells says whether a flag of a feed and date tells already that the date is not whole: by a late flag, or by one that asks something and
// names the file that was refused or the series that are missing.
func tells(g *rules.Flag) bool {
	return g.Kind == rules.KindLate || (g.Kind == rules.KindRefused || g.Kind == rules.KindMissing) && g.Standing.Asks()
}

// arrival is what a feed gave for a date, held against the series that it gave on its date before. It is nil when the date is none of the
// business days of those, or lies outside their lives.
func arrival(v View, s *rules.Settings, feed string, date rules.Date) (*rules.Arrival, error) {
	names, err := v.Names()
	if err != nil {
		return nil, err
	}
	of, refused, err := feedSteps(v, feed, date)
	if err != nil {
		return nil, err
	}
	a := &rules.Arrival{Feed: feed, Date: date, Refused: refused}
	expected, err := expectedOf(v, names, of, date)
	if err != nil {
		return nil, err
	}
	before := len(expected)
	if len(s.Calendars)+len(s.Lives) > 0 {
		maps.DeleteFunc(expected, func(id uint32, _ bool) bool { return !s.Expects(string(names.Name(id)), date) })
	}
	if before > 0 && len(expected) == 0 {
		return nil, nil
	}
	for _, bl := range allBlocks(names.Len(), rules.NoDate) {
		vals := make([]int64, bl.series)
		held, err := v.Fill(Returns, date, bl.number, 0, vals)
		if err != nil {
			return nil, err
		}
		for i, x := range vals {
			id := bl.number*BlockSize + uint32(i)
			switch there := held && x != Missing64; {
			case there && expected[id]:
				a.Came++
			case there:
				a.Others++
			case expected[id]:
				a.Miss(string(names.Name(id)))
			}
		}
	}
	return a, nil
}

// feedSteps are the steps of a feed's accepted files, and the last file about the date that was refused, if no later one was
// accepted.
func feedSteps(v View, feed string, date rules.Date) (of map[uint32]bool, refused string, err error) {
	of = map[uint32]bool{}
	err = v.Files(func(r FileRow) bool {
		if r.File.Feed != feed {
			return true
		}
		switch r.Outcome {
		case Accepted:
			of[r.Step] = true
			if r.First <= date && date <= r.Last {
				refused = ""
			}
		case Refused:
			if r.First <= date && date <= r.Last {
				refused = r.File.Name
			}
		}
		return true
	})
	return of, refused, err
}

// expectedOf are the series that the given steps gave on their newest date before a date.
func expectedOf(v View, names *Names, of map[uint32]bool, date rules.Date) (map[uint32]bool, error) {
	dates, err := v.Dates(Returns)
	if err != nil {
		return nil, err
	}
	n, _ := slices.BinarySearch(dates, date)
	expected := map[uint32]bool{}
	for i := n - 1; i >= max(0, n-lookBack) && len(expected) == 0; i-- {
		for _, bl := range allBlocks(names.Len(), rules.NoDate) {
			err := v.Layers(Returns, dates[i], bl.number, func(step uint32, vals []int64) error {
				for k, x := range vals {
					if x != Missing64 && of[step] {
						expected[bl.number*BlockSize+uint32(k)] = true
					}
				}
				return nil
			})
			if err != nil {
				return nil, err
			}
		}
	}
	return expected, nil
}

// Day is what the daily line says of a valuation date: how many series have a value, how many had one on the date before, and
// which of those have none now, at most a few by name.
func Day(v View, date rules.Date) (checked, expected int, missing []string, err error) {
	names, err := v.Names()
	if err != nil {
		return 0, 0, nil, err
	}
	dates, err := v.Dates(Returns)
	if err != nil {
		return 0, 0, nil, err
	}
	n, _ := slices.BinarySearch(dates, date)
	for _, bl := range allBlocks(names.Len(), rules.NoDate) {
		now, before := make([]int64, bl.series), make([]int64, bl.series)
		fillMissing(now)
		fillMissing(before)
		if _, err := v.Fill(Returns, date, bl.number, 0, now); err != nil {
			return 0, 0, nil, err
		}
		if n > 0 {
			if _, err := v.Fill(Returns, dates[n-1], bl.number, 0, before); err != nil {
				return 0, 0, nil, err
			}
		}
		for i := range now {
			if now[i] != Missing64 {
				checked++
			}
			if before[i] == Missing64 {
				continue
			}
			if expected++; now[i] == Missing64 && len(missing) < mostMissing {
				missing = append(missing, string(names.Name(bl.number*BlockSize+uint32(i))))
			}
		}
	}
	return checked, max(expected, checked), missing, nil
}

// mostMissing is how many missing series the daily line names.
const mostMissing = 5
