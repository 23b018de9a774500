package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"os"
	"sync/atomic"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/health"
	"strayd/watcher/schedule"
)

// The jobs of the daemon beside those of the feeds, which bear the feeds' names after this prefix.
const (
	feedJob      = "feed "
	deadlineJob  = "deadlines"
	dailyJob     = "daily line"
	everyMinute  = "* * * * *"
	dailyMargin  = 5 // minutes after the day's last deadline or slot
	lastOfTheDay = 23*60 + 59
)

// jobs are what the daemon does by schedule under a configuration.
func (d *daemon) jobs(c *config.Config) ([]schedule.Job, error) {
	var jobs []schedule.Job
	for _, f := range c.Feeds {
		when, err := schedule.Parse(cmp.Or(f.Schedule, defaultSchedule), c.Location)
		if err != nil {
			return nil, fmt.Errorf("feed %s: schedule: %w", f.Name, err)
		}
		jobs = append(jobs, schedule.Job{Name: feedJob + f.Name, When: when, Run: func(ctx context.Context, _ time.Time) error {
			return d.pass(ctx, f.Name)
		}})
	}
	minute, err := schedule.Parse(everyMinute, c.Location)
	if err != nil {
		return nil, err
	}
	daily, err := schedule.Parse(dailySpec(c, jobs), c.Location)
	if err != nil {
		return nil, err
	}
	return append(jobs, schedule.Job{Name: deadlineJob, When: minute, Run: d.deadlines},
		schedule.Job{Name: dailyJob, When: daily, Run: d.daily}), nil
}

// dailySpec is when the daily line is due, Monday to Friday: a little after the last deadline and the last look at a feed of a day.
func dailySpec(c *config.Config, feeds []schedule.Job) string {
	last := 0
	monday := time.Date(2026, 3, 9, 0, 0, 0, 0, c.Location)
	for _, j := range feeds {
		for t := j.When.Next(monday.Add(-time.Second)); !t.IsZero() && t.Before(monday.AddDate(0, 0, 1)); t = j.When.Next(t) {
			last = max(last, t.Hour()*60+t.Minute())
		}
	}
	for _, f := range c.Feeds {
		if f.Due != nil {
			at := rules.DueAt(*f.Due, rules.DateFrom(monday), location(c, f.Due.Timezone)).In(c.Location)
			last = max(last, at.Hour()*60+at.Minute())
		}
	}
	at := min(last+dailyMargin, lastOfTheDay)
	return fmt.Sprintf("%d %d * * mon-fri", at%60, at/60)
}

// location is a time zone by name, the configuration's when it is not named.
func location(c *config.Config, name string) *time.Location {
	if name != "" {
		if l, err := time.LoadLocation(name); err == nil {
			return l // the name was checked with the configuration
		}
	}
	return c.Location
}

// pass runs one pass over a feed, or over all with "".
func (d *daemon) pass(ctx context.Context, feed string) error {
	d.passing.Lock()
	defer d.passing.Unlock()
	c, _, post := d.inForce()
	p, err := d.program.newPass(c, d.ledger)
	if err != nil {
		return err
	}
	p.Only = feed
	p.Progress = func(string, int64, int64) { d.beats.beat() }
	p.Report = func(r watcher.FileReport) { d.logFile(r); post.Wake() }
	row, err := p.Run(ctx)
	d.mu.Lock()
	d.last = row
	d.mu.Unlock()
	post.Wake()
	if err == nil {
		d.heartbeat(ctx)
	}
	return err
}

func (d *daemon) logFile(r watcher.FileReport) {
	switch r.Fate {
	case watcher.FateAccepted:
		n := r.Row.Counts
		d.log.Info("file accepted", "feed", r.Feed, "file", r.Name, "rows", n.Rows, "new", n.New, "late", n.Late, "restated", n.Restated, "flags", n.Flags)
	case watcher.FateRefused:
		d.log.Warn("file refused", "feed", r.Feed, "file", r.Name, "why", r.Why)
	case watcher.FateWaiting:
		d.log.Debug("file waits", "feed", r.Feed, "file", r.Name, "why", r.Why)
	}
}

func (d *daemon) heartbeat(ctx context.Context) {
	if url := os.Getenv("STRAYD_HEARTBEAT_URL"); url != "" {
		if err := health.Heartbeat(ctx, health.NewSecret(url)); err != nil {
			d.log.Warn("the heartbeat address does not answer", "error", err)
		}
	}
}

// deadlines raises a late flag for each feed that was not whole when a valuation date fell due.
func (d *daemon) deadlines(ctx context.Context, slot time.Time) error {
	c, _, post := d.inForce()
	var errs []error
	for _, f := range c.Feeds {
		if f.Due != nil {
			errs = append(errs, d.feedDeadlines(ctx, c, f, slot))
		}
	}
	post.Wake()
	return errors.Join(errs...)
}

// feedDeadlines judges the dates of one feed that fell due since the last look.
func (d *daemon) feedDeadlines(ctx context.Context, c *config.Config, f rules.Feed, slot time.Time) error {
	name := "due " + f.Name
	since, err := d.ledger.LastSlot(name)
	if err != nil {
		return err
	}
	if since.IsZero() { // a feed that is new has no deadlines behind it
		return d.ledger.Done(name, slot)
	}
	zone := location(c, f.Due.Timezone)
	for _, date := range rules.DueBetween(*f.Due, since, slot, zone) {
		due := rules.DueAt(*f.Due, date, zone)
		if err := d.deadline(ctx, f, date, due); err != nil {
			return err
		}
		if err := d.ledger.Done(name, due); err != nil {
			return err
		}
	}
	return d.ledger.Done(name, slot)
}

// deadline looks once more at what has arrived, then judges whether the feed is whole.
func (d *daemon) deadline(ctx context.Context, f rules.Feed, date rules.Date, due time.Time) error {
	if err := d.pass(ctx, f.Name); err != nil {
		return err
	}
	d.passing.Lock()
	defer d.passing.Unlock()
	c, _, _ := d.inForce()
	p, err := d.program.newPass(c, d.ledger)
	if err != nil {
		return err
	}
	return p.Deadline(f, date, due)
}

// daily enqueues the line that says that all was checked.
func (d *daemon) daily(_ context.Context, slot time.Time) error {
	c, teller, post := d.inForce()
	channels, err := post.sender.Health()
	if err != nil {
		return err
	}
	news, err := dayNews(c, d.ledger, notify.Troubles(channels), slot)
	if err != nil {
		return err
	}
	defer post.Wake()
	return d.ledger.Add(teller.Daily(news))
}

// beats counts signs of progress, for the watchdog and the health answer.
type beats struct {
	count atomic.Int64
	seen  atomic.Int64
	at    atomic.Int64 // of the last one, in unix nanoseconds
}

func (b *beats) beat() {
	b.count.Add(1)
	b.at.Store(time.Now().UnixNano())
}

// progressed says whether there was a beat since it was asked last.
func (b *beats) progressed() bool {
	now := b.count.Load()
	return b.seen.Swap(now) != now
}

func (b *beats) last() time.Time { return time.Unix(0, b.at.Load()) }
