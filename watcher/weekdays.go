package watcher

import (
	"slices"
	"time"

	"strayd/rules"
)

// readDays counts, for each business day of the week, the series with a value of those that had one on the date held before it, over all
// and by the feed that brought that one.
func (w *weekReader) readDays(f *rules.WeekFacts) error {
	names, err := w.v.Names()
	if err != nil {
		return err
	}
	held, err := w.v.Dates(Returns)
	if err != nil {
		return err
	}
	// A date of today may still be on its way.
	end := min(w.ask.Span.Sunday(), rules.DateFrom(w.ask.Span.AsOf.In(w.ask.Zone))-1)
	for date := w.ask.Span.Monday; date <= end; date++ {
		n, _ := slices.BinarySearch(held, date)
		if n == 0 || !f.Calendar.Business(date) {
			continue // before the first date nothing was expected
		}
		before, err := w.dateBefore(held[:n])
		if err != nil || before == rules.NoDate {
			return err
		}
		d, err := w.day(names, date, before)
		if err != nil {
			return err
		}
		f.Days = append(f.Days, d)
	}
	return nil
}

// dateBefore is the newest of some dates on which anything was held then.
func (w *weekReader) dateBefore(held []rules.Date) (rules.Date, error) {
	one := make([]int64, 1)
	for n := len(held) - 1; n >= 0; n-- {
		for block := uint32(0); ; block++ {
			if names, err := w.v.Names(); err != nil || int(block)*BlockSize >= names.Len() {
				if err != nil {
					return rules.NoDate, err
				}
				break
			}
			if ok, err := w.then.Fill(Returns, held[n], block, 0, one); err != nil || ok {
				return held[n], err
			}
		}
	}
	return rules.NoDate, nil
}

func (w *weekReader) day(names *Names, date, before rules.Date) (rules.WeekDay, error) {
	d := rules.WeekDay{Date: date, Feeds: map[string]rules.Portion{}}
	for _, bl := range allBlocks(names.Len(), rules.NoDate) {
		now := make([]int64, bl.series)
		fillMissing(now)
		if _, err := w.then.Fill(Returns, date, bl.number, 0, now); err != nil {
			return d, err
		}
		from, err := w.feedsOf(before, bl)
		if err != nil {
			return d, err
		}
		for i, feed := range from {
			here := now[i] != Missing64
			if feed == "" || !here && !w.settings.Expects(string(names.Name(bl.number*BlockSize+uint32(i))), date) {
				if here {
					d.Add(rules.Portion{Part: 1, Whole: 1}) // of a series that is new, or back
				}
				continue
			}
			p := rules.Portion{Whole: 1}
			if here {
				p.Part = 1
			}
			d.Add(p)
			all := d.Feeds[feed]
			all.Add(p)
			d.Feeds[feed] = all
		}
	}
	return d, nil
}

// feedsOf is the feed that brought each series' newest value of a date, "" where it has none.
func (w *weekReader) feedsOf(date rules.Date, bl block) ([]string, error) {
	out := make([]string, bl.series)
	err := w.v.Layers(Returns, date, bl.number, func(step uint32, vals []int64) error {
		file, known := w.files[step]
		if !known {
			return nil // a later one than the week knows
		}
		for i := range out {
			if vals[i] != Missing64 {
				out[i] = file.File.Feed
			}
		}
		return nil
	})
	return out, err
}

// readRestated finds the values of which files of the week brought another version.
func (w *weekReader) readRestated(f *rules.WeekFacts) error {
	f.Restated = map[string]rules.Restatements{}
	dates, err := w.v.Dates(Returns)
	if err != nil {
		return err
	}
	steps := map[uint32]string{}
	first, last := rules.Date(0), rules.NoDate
	for step, r := range w.files {
		if r.Counts.Restated == 0 || !w.ask.Span.During(r.Received) {
			continue
		}
		if len(steps) == 0 || r.First < first {
			first = r.First
		}
		steps[step], last = r.File.Feed, max(last, r.Last)
	}
	if len(steps) == 0 {
		return nil
	}
	names, err := w.v.Names()
	if err != nil {
		return err
	}
	for _, date := range dates {
		if date < first || date > last+1 { // a price changes the return of the date after too
			continue
		}
		for _, bl := range allBlocks(names.Len(), rules.NoDate) {
			if err := w.restatedIn(f, date, bl, steps); err != nil {
				return err
			}
		}
	}
	return nil
}

func (w *weekReader) restatedIn(f *rules.WeekFacts, date rules.Date, bl block, steps map[uint32]string) error {
	held := make([]int64, bl.series)
	fillMissing(held)
	return w.v.Layers(Returns, date, bl.number, func(step uint32, vals []int64) error {
		feed, counts := steps[step]
		for i := range held {
			if vals[i] == Missing64 {
				continue
			}
			if counts && held[i] != Missing64 && held[i] != vals[i] {
				r := f.Restated[feed]
				r.Add(date, rules.Units(held[i]), rules.Units(vals[i]))
				f.Restated[feed] = r
			}
			held[i] = vals[i]
		}
		return nil
	})
}

// readArrivals finds when the values came that were decided to be wrong in the week: of each, the version that its flag is about.
func (w *weekReader) readArrivals(f *rules.WeekFacts) error {
	wrong := map[uint64]bool{}
	for i := range f.Acts {
		if e := &f.Acts[i]; e.Deed == rules.Decide && e.Conclusion != rules.Genuine && w.ask.Span.During(e.At) {
			for _, ref := range e.Refs {
				wrong[ref] = true
			}
		}
	}
	if len(wrong) == 0 {
		return nil
	}
	names, err := w.v.Names()
	if err != nil {
		return err
	}
	f.Arrived = map[uint64]time.Time{}
	for i := range f.Flags {
		g := &f.Flags[i]
		id, known := names.Find([]byte(g.Series))
		if !wrong[g.Ref] || !known {
			continue
		}
		versions, err := w.v.Series(Returns, id)
		if err != nil {
			return err
		}
		for _, v := range versions {
			if file, ok := w.files[v.Step]; ok && v.Date == g.Date && v.Step <= g.Step {
				f.Arrived[g.Ref] = file.Received
			}
		}
	}
	return nil
}
