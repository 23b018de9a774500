package main

import (
	"maps"
	"os"
	"sync"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/health"
	"strayd/watcher/schedule"
)

// report is how the daemon is now, for the health pages.
func (d *daemon) report() health.Report {
	d.mu.Lock()
	s, bad, badAt := d.setup, d.bad, d.badAt
	d.mu.Unlock()
	r := health.Report{Version: version, Started: d.started, Now: time.Now(), Beat: d.beats.last(), Stopping: d.stopping.Load(),
		Configuration: health.Configuration{Valid: true, Hash: s.hash, Error: bad, ErrorAt: badAt}, ClockSteps: d.loop.Steps()}
	for _, status := range d.loop.Status() {
		r.Jobs = append(r.Jobs, jobReport(status, s.config.Location))
	}
	if channels, err := s.post.sender.Health(); err == nil {
		for _, h := range channels {
			r.Channels = append(r.Channels, channelReport(h))
		}
	}
	r.Ledger = health.Ledger{Path: s.config.Ledger}
	if v, err := d.ledger.View(); err == nil {
		defer v.Close() //nolint:errcheck // only read
		d.readLedger(s.config, v, &r)
	}
	return r
}

// readLedger tells of the ledger as far as it can be read.
func (d *daemon) readLedger(c *config.Config, v watcher.View, r *health.Report) {
	r.Ledger.Step = uint64(v.Step())
	if info, err := os.Stat(c.Ledger); err == nil {
		r.Ledger.Bytes = info.Size()
	}
	newest, series, err := d.seen.upTo(v)
	if err != nil {
		return
	}
	r.Ledger.Series = series
	for _, f := range c.Feeds {
		feed := newest[f.Name]
		feed.Name = f.Name
		if feed.At.IsZero() {
			feed.Date = rules.NoDate
		}
		r.Feeds = append(r.Feeds, feed)
	}
	last, _, err := v.LastPass()
	if err != nil {
		return
	}
	r.Pass = passReport(last)
	r.OpenFlags, r.Pass.Flags = map[rules.Kind]int{}, map[rules.Kind]int{}
	today := rules.DateFrom(r.Now.In(c.Location))
	r.Ledger.Open = v.Flags(false, func(f rules.Flag) bool {
		if !f.AsksOn(today) {
			return true
		}
		r.OpenFlags[f.Kind]++
		if f.RaisedAt.Equal(last.Started) {
			r.Pass.Flags[f.Kind]++
		}
		return true
	}) == nil
}

// feedsSeen keeps the newest accepted file of each feed and the number of series, so that an answer reads only the steps since the one
// before.
type feedsSeen struct {
	mu     sync.Mutex
	step   uint32
	newest map[string]health.Feed
	series int
}

func (s *feedsSeen) upTo(v watcher.View) (newest map[string]health.Feed, series int, err error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.newest == nil || s.step < v.Step() {
		if err := s.read(v); err != nil {
			s.newest = nil
			return nil, 0, err
		}
	}
	return maps.Clone(s.newest), s.series, nil
}

func (s *feedsSeen) read(v watcher.View) error {
	names, err := v.Names()
	if err != nil {
		return err
	}
	s.series = names.Len()
	if s.newest == nil {
		s.newest, s.step = map[string]health.Feed{}, v.Step()
		return v.Files(func(f watcher.FileRow) bool { s.see(f); return true })
	}
	for ; s.step < v.Step(); s.step++ {
		f, err := v.File(s.step + 1)
		if err != nil {
			return err
		}
		s.see(f)
	}
	return nil
}

func (s *feedsSeen) see(f watcher.FileRow) {
	if f.Outcome == watcher.Accepted {
		s.newest[f.File.Feed] = health.Feed{Name: f.File.Feed, File: f.File.Name, Date: f.Last, At: f.Received}
	}
}

func jobReport(s schedule.Status, zone *time.Location) health.Job {
	j := health.Job{Name: s.Job, LastSlot: s.Last, Outcome: string(s.Outcome), Error: s.Error, NextSlot: s.Next, Running: s.Began, Runs: s.Runs,
		Failed: s.Failed, Panics: s.Panics, Missed: s.Missed, Coalesced: s.Coalesced}
	if when, err := schedule.Parse(s.Spec, zone); err == nil && !s.Next.IsZero() {
		j.Every = when.Next(s.Next).Sub(s.Next)
	}
	if before := s.Next.Sub(s.Last); !s.Last.IsZero() && before > 0 {
		j.Every = min(j.Every, before)
	}
	return j
}

func channelReport(h notify.Health) health.Channel {
	c := health.Channel{Name: h.Channel, State: health.ChannelOK, Waiting: h.Waiting, Failed: h.Failed, Error: string(h.Class), Fallback: h.Fallback}
	if h.Overdue > 0 {
		c.Oldest = time.Now().Add(-h.Overdue)
	}
	switch {
	case h.State == notify.Stopped:
		c.State, c.Reason = health.ChannelDead, string(h.Class)
	case h.Class != "" && h.Waiting > 0, h.Fallback != "":
		c.State, c.Reason = health.ChannelWaiting, string(h.Class)
	}
	return c
}

func passReport(row watcher.PassRow) health.Pass {
	n := row.Counts
	return health.Pass{Number: row.Number, Started: row.Started, Ended: row.Ended, Error: row.Failed, Accepted: row.Accepted, Refused: row.Refused,
		Waiting:  row.Waiting,
		Verdicts: map[rules.Finding]int{rules.Inside: n.Inside, rules.Watch: n.Watch, rules.Breach: n.Breach, rules.NotJudged: n.NotJudged}}
}

// dayNews gathers what the daily line of a slot says. dead are the channels that do not deliver.
func dayNews(c *config.Config, l watcher.Store, dead []string, slot time.Time) (news rules.DayNews, err error) {
	v, err := l.View()
	if err != nil {
		return news, err
	}
	defer v.Close() //nolint:errcheck // only read
	since := startOfDay(slot.In(c.Location))
	news = rules.DayNews{At: slot, Date: rules.NoDate}
	whole := map[string]bool{}
	if err := v.Files(func(f watcher.FileRow) bool {
		if f.Received.Before(since) || f.Received.After(slot.Add(time.Minute)) {
			return true
		}
		switch f.Outcome {
		case watcher.Accepted:
			news.Files++
			news.Date = max(news.Date, f.Last)
			whole[f.File.Feed] = true
		case watcher.Refused:
			news.Refused++
		}
		return true
	}); err != nil {
		return news, err
	}
	if news.Date != rules.NoDate {
		if news.Checked, news.Expected, news.Missing, err = watcher.Day(v, news.Date); err != nil {
			return news, err
		}
	}
	news.Feeds, news.FeedsDue = len(whole), len(c.Feeds)
	if err := countFlags(v, c.Calendar.Days, since, &news); err != nil {
		return news, err
	}
	news.Dead = dead
	news.Head, err = v.Head()
	return news, err
}

// countFlags counts the flags raised since a time, and those that still ask something.
func countFlags(v watcher.View, days *rules.Calendar, since time.Time, news *rules.DayNews) error {
	oldest, today := time.Time{}, rules.DateFrom(news.At)
	return v.Flags(true, func(f rules.Flag) bool {
		if f.AsksOn(today) {
			if news.Open++; oldest.IsZero() || f.RaisedAt.Before(oldest) {
				oldest, news.OldestRef = f.RaisedAt, f.Ref
				news.OldestDays = days.Between(rules.DateFrom(oldest), rules.DateFrom(news.At))
			}
		}
		if f.RaisedAt.Before(since) || f.Standing == rules.OfHistory {
			return true
		}
		switch f.Kind {
		case rules.KindBreach:
			news.Breaches++
		case rules.KindLimit:
			news.Limits++
		case rules.KindRestated:
			news.Restated++
		}
		return true
	})
}

func startOfDay(t time.Time) time.Time {
	y, m, day := t.Date()
	return time.Date(y, m, day, 0, 0, 0, 0, t.Location())
}
