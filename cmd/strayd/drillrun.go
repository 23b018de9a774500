package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"time"

	"strayd/config"
	"strayd/rules"
	"strayd/rules/drill"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// When things happen on a day of a drill: files come at this hour, or before the first deadline where there is one.
const (
	drillHour  = 18
	beforeDue  = time.Hour
	resendWait = 10 * time.Minute
	lateBy     = 20 * time.Minute
)

// drillRun plays one plan: the book with its plants comes in as files, day by day, and the real pass judges it with the settings of the
// configuration. Nobody decides anything.
type drillRun struct {
	ctx     context.Context
	config  *config.Config // its feeds are those of the drill's folder
	folder  string
	truth   *drill.Book
	planted *drill.Book
	plan    *drill.Plan
	ledger  *ledger.Ledger
	make    func(*config.Config, watcher.Store) (*watcher.Pass, error)
	raised  map[time.Time]rules.Date // the date that each pass was about
	before  *watcher.Pass            // the last one
	day     func()                   // told of each date that is done
}

// drillConfig is the configuration of a drill: the user's settings over feeds that read the files which the drill writes.
func drillConfig(c *config.Config, folder string) *config.Config {
	d := *c
	d.Ledger = filepath.Join(folder, "ledger.db")
	d.Events = ""
	d.Channels, d.Weekly = nil, nil
	d.Feeds = slices.Clone(c.Feeds)
	for i := range d.Feeds {
		f := &d.Feeds[i]
		f.Dir, f.Pattern = filepath.Join(folder, fmt.Sprintf("inbox-%d", i)), "*.csv"
		f.Layout, f.Columns = rules.Long, rules.Columns{Date: "date", Series: "series", Value: "return"}
		f.Value, f.Unit, f.DateStyle = rules.OfReturn, rules.Percent, "YYYY-MM-DD"
		f.Decimal, f.Separator, f.Encoding, f.Missing = '.', ',', "utf-8", []string{""}
		f.Settle, f.Sentinel = 0, ""
	}
	return &d
}

// folders makes the folder of each feed.
func (r *drillRun) folders() error {
	for _, f := range r.config.Feeds {
		if err := os.MkdirAll(f.Dir, 0o700); err != nil {
			return err
		}
	}
	return nil
}

// with opens the drill's ledger for a piece of work.
func (r *drillRun) with(mode ledger.Mode, do func() error) error {
	if err := r.folders(); err != nil {
		return err
	}
	l, err := ledger.Open(r.config.Ledger, ledger.Options{Mode: mode, AnyFilesystem: true, Scratch: true})
	if err != nil {
		return err
	}
	r.ledger = l
	return errors.Join(do(), l.Close())
}

// load takes the dates before the drill as a first load, one file a feed.
func (r *drillRun) load() error {
	for i, f := range r.config.Feeds {
		text, rows := r.planted.Text(f.Name, 0, r.plan.From)
		if rows > 0 {
			if err := os.WriteFile(filepath.Join(r.config.Feeds[i].Dir, "history.csv"), []byte(text), 0o600); err != nil {
				return err
			}
		}
	}
	refused, err := r.pass(r.plan.From-1, clock(r.truth.Dates[r.plan.From-1], drillHour, 0))
	if err == nil && len(refused) > 0 {
		err = fmt.Errorf("the history was refused: %s", refused[0].Why)
	}
	return errors.Join(err, r.empty())
}

// all plays the dates of the drill, one after another.
func (r *drillRun) all() error {
	for t := r.plan.From; t < len(r.truth.Dates); t++ {
		if err := r.ctx.Err(); err != nil {
			return err
		}
		if err := r.date(t); err != nil {
			return fmt.Errorf("%s: %w", r.truth.Dates[t], err)
		}
		if r.day != nil {
			r.day()
		}
	}
	return nil
}

// date plays one valuation date: the files come an hour before the first deadline, a refused one is sent again as it should have been,
// deadlines pass, and late files come.
func (r *drillRun) date(t int) error {
	first, dues := r.hours(t)
	for _, f := range r.config.Feeds {
		if err := r.send(f, t); err != nil {
			return err
		}
	}
	refused, err := r.pass(t, first)
	if err != nil {
		return err
	}
	if err := r.resend(t, refused, first.Add(resendWait)); err != nil {
		return err
	}
	last := first
	for _, d := range dues {
		last = d.at
		if err := r.deadline(t, d); err != nil {
			return err
		}
	}
	if err := r.late(t, last.Add(lateBy)); err != nil {
		return err
	}
	return r.empty()
}

// due is when a feed is due for a date.
type due struct {
	feed rules.Feed
	at   time.Time
}

// hours are when the files of a date come, and the deadlines of the feeds that have something for it, in their order.
func (r *drillRun) hours(t int) (first time.Time, dues []due) {
	date := r.truth.Dates[t]
	for _, f := range r.config.Feeds {
		if f.Due == nil {
			continue
		}
		if _, rows := r.truth.Text(f.Name, t, t+1); rows > 0 {
			dues = append(dues, due{f, rules.DueAt(*f.Due, date, location(r.config, f.Due.Timezone))})
		}
	}
	slices.SortStableFunc(dues, func(a, b due) int { return a.at.Compare(b.at) })
	first = clock(date, drillHour, 0)
	if len(dues) > 0 {
		first = dues[0].at.Add(-beforeDue)
	}
	if morning := clock(date, 0, 1); first.Before(morning) {
		first = morning
	}
	return first, dues
}

func (r *drillRun) deadline(t int, d due) error {
	p, err := r.newPass(t, d.at)
	if err != nil {
		return err
	}
	return p.Deadline(d.feed, r.truth.Dates[t], d.at)
}

// newPass makes a pass of the program over the drill's ledger, which tells nobody.
func (r *drillRun) newPass(t int, now time.Time) (*watcher.Pass, error) {
	p, err := r.make(r.config, r.ledger)
	if err != nil {
		return nil, err
	}
	p.Settings.Events = r.planted.Events
	p.Now, p.Settled, p.Tell = now.UTC(), true, nil
	p.Follow(r.before)
	r.before, r.raised[p.Now] = p, r.truth.Dates[t]
	return p, nil
}

// pass runs one pass and gives what was refused.
func (r *drillRun) pass(t int, now time.Time) (refused []watcher.FileReport, err error) {
	p, err := r.newPass(t, now)
	if err != nil {
		return nil, err
	}
	p.Report = func(f watcher.FileReport) {
		if f.Fate == watcher.FateRefused {
			refused = append(refused, f)
		}
	}
	_, err = p.Run(r.ctx)
	return refused, err
}

// flags reads what was raised about the dates of the drill.
func (r *drillRun) flags() (out []drill.Flag, err error) {
	v, err := r.ledger.View()
	if err != nil {
		return nil, err
	}
	defer v.Close() //nolint:errcheck // only read
	from := r.truth.Dates[r.plan.From]
	err = v.Flags(true, func(g rules.Flag) bool {
		if g.Date >= from {
			out = append(out, drill.Flag{Date: g.Date, Raised: r.raised[g.RaisedAt.UTC()], Series: g.Series, Group: g.Group, Feed: g.Feed, Kind: g.Kind,
				Range: g.Range, LooksLike: g.LooksLike})
		}
		return true
	})
	return out, err
}
