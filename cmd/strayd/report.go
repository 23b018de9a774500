package main

import (
	"os"
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
	c, last, bad, badAt, hash, post := d.config, d.last, d.bad, d.badAt, d.hash, d.post
	d.mu.Unlock()
	r := health.Report{Version: version, Started: d.started, Now: time.Now(), Beat: d.beats.last(), Stopping: d.stopping.Load(),
		Configuration: health.Configuration{Valid: true, Hash: hash, Error: bad, ErrorAt: badAt}, Pass: passReport(last), ClockSteps: d.loop.Steps()}
	for _, s := range d.loop.Status() {
		r.Jobs = append(r.Jobs, jobReport(s))
	}
	if channels, err := post.sender.Health(); err == nil {
		for _, h := range channels {
			r.Channels = append(r.Channels, channelReport(h))
		}
	}
	r.Ledger = health.Ledger{Path: c.Ledger}
	if v, err := d.ledger.View(); err == nil {
		d.readLedger(c, v, &r)
		v.Close() //nolint:errcheck // only read
	}
	return r
}

func (d *daemon) readLedger(c *config.Config, v watcher.View, r *health.Report) {
	r.Ledger.Open, r.Ledger.Step = true, uint64(v.Step())
	if info, err := os.Stat(c.Ledger); err == nil {
		r.Ledger.Bytes = info.Size()
	}
	if names, err := v.Names(); err == nil {
		r.Ledger.Series = names.Len()
	}
	r.OpenFlags = map[rules.Kind]int{}
	v.Flags(false, func(f rules.Flag) bool { r.OpenFlags[f.Kind]++; return true }) //nolint:errcheck // counts as far as they go
	newest := map[string]health.Feed{}
	v.Files(func(f watcher.FileRow) bool { //nolint:errcheck // as above
		if f.Outcome == watcher.Accepted {
			newest[f.File.Feed] = health.Feed{Name: f.File.Feed, File: f.File.Name, Date: f.Last, At: f.Received}
		}
		return true
	})
	for _, f := range c.Feeds {
		feed := newest[f.Name]
		feed.Name = f.Name
		if feed.At.IsZero() {
			feed.Date = rules.NoDate
		}
		r.Feeds = append(r.Feeds, feed)
	}
}

func jobReport(s schedule.Status) health.Job {
	j := health.Job{Name: s.Job, LastSlot: s.Last, Outcome: string(s.Outcome), Error: s.Error, NextSlot: s.Next, Running: s.Began, Runs: s.Runs,
		Failed: s.Failed, Panics: s.Panics, Missed: s.Missed, Coalesced: s.Coalesced}
	if !s.Last.IsZero() && s.Next.After(s.Last) {
		j.Every = s.Next.Sub(s.Last)
	}
	return j
}

func channelReport(h notify.Health) health.Channel {
	c := health.Channel{Name: h.Channel, State: health.ChannelOK, Waiting: h.Waiting, Failed: h.Failed, Error: string(h.Class)}
	if h.Overdue > 0 {
		c.Oldest = time.Now().Add(-h.Overdue)
	}
	switch {
	case h.State == notify.Stopped:
		c.State, c.Reason = health.ChannelDead, string(h.Class)
	case h.Class != "":
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
	if err := countFlags(v, since, &news); err != nil {
		return news, err
	}
	news.Dead = dead
	news.Head, err = v.Head()
	return news, err
}

// countFlags counts the flags raised since a time, and those that still ask something.
func countFlags(v watcher.View, since time.Time, news *rules.DayNews) error {
	oldest := time.Time{}
	return v.Flags(true, func(f rules.Flag) bool {
		if f.Standing.Asks() {
			if news.Open++; oldest.IsZero() || f.RaisedAt.Before(oldest) {
				oldest, news.OldestRef = f.RaisedAt, f.Ref
				news.OldestDays = rules.Weekdays(rules.DateFrom(oldest), rules.DateFrom(news.At))
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
