package watcher

import (
	"context"
	"time"

	"strayd/rules"
)

// Chronicle is what the weekly log reads of a ledger beside what a pass needs.
type Chronicle interface {
	View
	// Passes calls each with every row of the run record, oldest first, until it returns false.
	Passes(each func(PassRow) bool) error
	// Notices calls each with every notice by number, until it returns false.
	Notices(each func(rules.Notice) bool) error
	// Entries calls each with every entry of the hash-chained record and its hash in hex, oldest first, until it returns false.
	Entries(each func(e RecordEntry, hash string) bool) error
}

// WeekAsk is of which week the facts are asked, and what the configuration says of it.
type WeekAsk struct {
	Span     rules.WeekSpan
	Zone     *time.Location
	Groups   []rules.Group
	Feeds    []rules.Feed
	Owner    func(series string) string           // nil without a register
	Due      func(from, to time.Time) int         // passes that the schedule has in a time; nil where it has none
	Progress func(work string, done, total int64) // nil: not told
}

// WeekFacts gathers the facts of a week from a reading.
func WeekFacts(ctx context.Context, v Chronicle, ask WeekAsk) (*rules.WeekFacts, error) {
	w := &weekReader{ctx: ctx, v: v, ask: ask, files: map[uint32]FileRow{}}
	f := &rules.WeekFacts{Span: ask.Span, Zone: ask.Zone, Groups: ask.Groups, Owner: ask.Owner, Feeds: ask.Feeds}
	for _, part := range []func(*rules.WeekFacts) error{w.readFiles, w.readFlags, w.readRecord, w.readRuns, w.readDays, w.readRestated, w.readArrivals, w.readCovers} {
		if err := part(f); err != nil {
			return nil, err
		}
	}
	return f, nil
}

// weekReader reads one week.
type weekReader struct {
	ctx      context.Context
	v        Chronicle
	then     View // as of the week
	ask      WeekAsk
	files    map[uint32]FileRow // accepted ones
	settings *rules.Settings
	before   *rules.Settings // those in force when the week began, nil when they are the same
}

// readFiles finds the step that the week ends with, and the files up to it.
func (w *weekReader) readFiles(f *rules.WeekFacts) error {
	last := uint32(0)
	if err := w.v.Files(func(r FileRow) bool {
		if r.Received.After(w.ask.Span.AsOf) {
			return true
		}
		last = max(last, r.Step)
		f.Settings = max(f.Settings, r.Settings)
		if r.Fileless() {
			return true
		}
		if r.Outcome == Accepted {
			w.files[r.Step] = r
		}
		f.Files = append(f.Files, rules.WeekFile{Feed: r.File.Feed, At: r.Received, Last: r.Last, Refused: r.Outcome == Refused, Rows: r.Counts.Rows,
			Restated: r.Counts.Restated})
		return true
	}); err != nil {
		return err
	}
	w.then = w.v.AsOf(last)
	return w.readSettings(f)
}

// readSettings reads those in force at the end of the week.
func (w *weekReader) readSettings(f *rules.WeekFacts) error {
	if f.Settings == 0 {
		w.settings = &rules.Settings{}
		return nil
	}
	text, err := w.v.Settings(f.Settings)
	if err != nil {
		return err
	}
	w.settings, err = rules.ParseSettings(text)
	f.Calendar = w.settings.CalendarFor("")
	return err
}

func (w *weekReader) readFlags(f *rules.WeekFacts) error {
	return w.then.Flags(true, func(g rules.Flag) bool {
		if g.Standing != rules.OfHistory {
			f.Flags = append(f.Flags, g)
		}
		return true
	})
}

// readRecord reads decisions and changes of settings up to the week's end.
func (w *weekReader) readRecord(f *rules.WeekFacts) error {
	var failed error
	number, old := uint32(0), &rules.Settings{}
	err := w.v.Entries(func(e RecordEntry, hash string) bool {
		if e.At.After(w.ask.Span.AsOf) {
			return true
		}
		f.Head = hash
		switch e.Kind {
		case DecisionEntry:
			var act *rules.Entry
			if act, failed = rules.ParseEntry(e.Body); failed == nil {
				act.At = e.At
				f.Acts = append(f.Acts, *act)
			}
		case SettingsEntry:
			number++
			now, err := rules.ParseSettings(e.Body)
			if failed = err; err != nil {
				return false
			}
			if number > 1 && w.ask.Span.During(e.At) {
				f.Changes = append(f.Changes, rules.Change{Number: number, At: e.At, Who: e.Who, What: rules.Differences(old, now)})
				if w.before == nil {
					w.before = old
				}
			}
			old = now
		}
		return failed == nil
	})
	if err == nil {
		err = failed
	}
	return err
}

func (w *weekReader) readRuns(f *rules.WeekFacts) error {
	span := w.ask.Span
	if w.ask.Due != nil {
		end := span.End
		if span.AsOf.Before(end) {
			end = span.AsOf
		}
		f.Due = w.ask.Due(span.Start, end)
	}
	if err := w.v.Passes(func(r PassRow) bool {
		if span.During(r.Started) {
			f.Passes = append(f.Passes, rules.WeekPass{Started: r.Started, Ended: r.Ended, Failed: r.Failed != ""})
		}
		return true
	}); err != nil {
		return err
	}
	return w.v.Notices(func(n rules.Notice) bool {
		if span.During(n.Made) {
			f.Notices = append(f.Notices, rules.WeekNotice{State: n.State})
		}
		return true
	})
}

// readCovers judges the dates up to the week once more, and where the settings changed in it, runs them back under the old and the new ones.
func (w *weekReader) readCovers(f *rules.WeekFacts) error {
	names, err := w.v.Names()
	if err != nil {
		return err
	}
	now, err := scanCover(w.ctx, w.then, names, w.settings, w.ask.Span.Monday, w.progress("coverage"))
	if err != nil {
		return err
	}
	f.Covers, f.Thin = now.all(rules.CoverDates), now.thin
	if w.before == nil || len(f.Changes) == 0 {
		return nil
	}
	f.Changes[len(f.Changes)-1].BackRun, err = w.backRuns()
	return err
}

func (w *weekReader) progress(work string) func(done, total int64) {
	return func(done, total int64) {
		if w.ask.Progress != nil {
			w.ask.Progress(work, done, total)
		}
	}
}
