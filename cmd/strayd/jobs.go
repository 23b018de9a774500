package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"os"
	"slices"
	"strings"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/health"
	"strayd/watcher/schedule"
)

// The jobs of the daemon. Those of a feed bear its name after the word.
const (
	feedJob      = "feed "
	deadlineJob  = "deadline "
	dailyJob     = "daily line"
	weeklyJob    = "weekly log"
	dailyMargin  = 5 // minutes after the day's last deadline or slot
	lastOfTheDay = 23*60 + 59
)

// judged is the slot that holds up to where a feed's deadlines are judged.
const judged = "due "

// jobs are what the daemon does by schedule under a configuration.
func (d *daemon) jobs(c *config.Config) ([]schedule.Job, error) {
	var jobs []schedule.Job
	for _, f := range c.Feeds {
		when, err := schedule.Parse(cmp.Or(f.Schedule, defaultSchedule), c.Location)
		if err != nil {
			return nil, fmt.Errorf("feed %s: schedule: %w", f.Name, err)
		}
		jobs = append(jobs, schedule.Job{Name: feedJob + f.Name, When: when, Run: func(ctx context.Context, slot time.Time) error {
			return errors.Join(d.pass(ctx, f.Name), d.deadlines(ctx, f.Name, slot))
		}})
	}
	daily, err := schedule.Parse(dailySpec(c, jobs), c.Location)
	if err != nil {
		return nil, err
	}
	for _, f := range c.Feeds {
		if f.Due == nil {
			continue
		}
		when, err := schedule.Parse(fmt.Sprintf("%d %d * * %s", f.Due.Minutes%60, f.Due.Minutes/60, weekdays(c)), location(c, f.Due.Timezone))
		if err != nil {
			return nil, fmt.Errorf("feed %s: due: %w", f.Name, err)
		}
		jobs = append(jobs, schedule.Job{Name: deadlineJob + f.Name, When: when, Run: func(ctx context.Context, slot time.Time) error {
			return d.deadlines(ctx, f.Name, slot)
		}})
	}
	jobs = append(jobs, schedule.Job{Name: dailyJob, When: daily, Run: d.daily})
	if timed(c) {
		when, err := schedule.Parse(escalationSpec, c.Location)
		if err != nil {
			return nil, err
		}
		jobs = append(jobs, schedule.Job{Name: escalationJob, When: when, Run: d.escalate})
	}
	if c.Weekly == nil {
		return jobs, nil
	}
	when, err := schedule.Parse(c.Weekly.Schedule, c.Location)
	if err != nil {
		return nil, fmt.Errorf("weekly: schedule: %w", err)
	}
	return append(jobs, schedule.Job{Name: weeklyJob, When: when, Run: d.weekly}), nil
}

// weekdays are the days of the week on which there is business, as cron text.
func weekdays(c *config.Config) string {
	var days []string
	for d := time.Sunday; d <= time.Saturday; d++ {
		if c.Calendar.Days.Weekdays().Has(d) {
			days = append(days, fmt.Sprint(int(d)))
		}
	}
	return strings.Join(days, ",")
}

// dailySpec is when the daily line is due, on the days of business: a little after the last deadline and the last look at a feed of a day.
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
	return fmt.Sprintf("%d %d * * %s", at%60, at/60, weekdays(c))
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

// pass runs one pass over a feed, or over all with "". One that fails is told to the channels, once a day.
func (d *daemon) pass(ctx context.Context, feed string) error {
	err := d.onePass(ctx, feed)
	if err != nil && ctx.Err() == nil {
		d.failed(feedJob+feed, err)
	}
	if err == nil {
		select {
		case d.heart <- struct{}{}:
		default: // the keeper is about to know
		}
	}
	return err
}

func (d *daemon) onePass(ctx context.Context, feed string) error {
	s, done, err := d.turn(ctx)
	if err != nil {
		return err
	}
	defer done()
	p, err := d.newPass(s.config)
	if err != nil {
		return err
	}
	p.Only = feed
	p.Progress = func(string, int64, int64) { d.beats.beat() }
	p.Report = func(r watcher.FileReport) { d.logFile(r); s.post.Wake() }
	_, err = p.Run(ctx)
	d.sayTroubles(s)
	return err
}

// sayTroubles tells of channels that do not deliver, after each pass, so that the log never falls silent about them.
func (d *daemon) sayTroubles(s *setup) {
	channels, err := s.post.sender.Health()
	if err != nil {
		d.log.Error("the outbox cannot be read", "error", err)
	}
	for _, trouble := range notify.Troubles(channels) {
		d.log.Error("a channel does not deliver", "channel", trouble)
	}
}

// failed tells the channels that a job failed, once a day.
func (d *daemon) failed(job string, err error) {
	d.say("failed "+job, "", fmt.Sprintf("FAILED: %s: %v", job, err), "It is tried again at its next time. What was published before it stands.")
}

// say tells every channel but one a word about the program, once a day for each topic.
func (d *daemon) say(topic, but string, lines ...string) {
	s := d.inForce()
	now := time.Now()
	word := notify.Word{At: now, Key: topic + " " + now.In(s.config.Location).Format(time.DateOnly), But: but, Lines: lines}
	if err := d.ledger.Add(s.teller.Word(word)); err != nil {
		d.log.Error("the outbox cannot be written", "error", err)
	}
	s.post.Wake()
}

// delivered tells the other channels of one that died.
func (d *daemon) delivered(e notify.Event) {
	if !e.Stopped {
		return
	}
	second := "Its notices wait. `strayd notices` lists them."
	for _, ch := range d.inForce().config.Channels {
		if ch.Name == e.Channel && ch.Fallback != "" {
			second = fmt.Sprintf("Its notices go to channel %s.", ch.Fallback)
		}
	}
	d.say("dead "+e.Channel, e.Channel, fmt.Sprintf("Channel %s delivers nothing: %s", e.Channel, e.Reason), second)
}

func (d *daemon) panicked(job string, value any) {
	d.failed(job, fmt.Errorf("internal error: %v", value))
}

func (d *daemon) logFile(r watcher.FileReport) {
	switch r.Fate {
	case watcher.FateAccepted:
		n := r.Row.Counts
		d.log.Info("file accepted", "feed", r.Feed, "file", r.Name, "rows", n.Rows, "new", n.New, "late", n.Late, "restated", n.Restated, "flags", n.Flags)
	case watcher.FateRefused:
		d.log.Warn("file refused", "feed", r.Feed, "file", r.Name, "why", r.Why)
	case watcher.FateChecked:
		d.log.Info(r.Why)
	case watcher.FateWaiting:
		d.log.Debug("file waits", "feed", r.Feed, "file", r.Name, "why", r.Why)
	}
}

func heartbeatURL() health.Secret { return health.NewSecret(os.Getenv("STRAYD_HEARTBEAT_URL")) }

// heartbeats tells the heartbeat's keeper of passes that went well. An address that hangs holds nothing else up.
func (d *daemon) heartbeats(ctx context.Context) {
	url := heartbeatURL()
	for {
		select {
		case <-ctx.Done():
			return
		case <-d.heart:
		}
		if url.Empty() {
			continue
		}
		if err := health.Heartbeat(ctx, url); err != nil && ctx.Err() == nil {
			d.log.Warn("the heartbeat address does not answer", "error", err)
		}
	}
}

// beginDeadlines notes from when on the deadlines of feeds count that are new: none lies behind them.
func (d *daemon) beginDeadlines(c *config.Config) error {
	for _, f := range c.Feeds {
		if f.Due == nil {
			continue
		}
		since, err := d.ledger.LastSlot(judged + f.Name)
		if err == nil && since.IsZero() {
			err = d.ledger.Done(judged+f.Name, time.Now())
		}
		if err != nil {
			return err
		}
	}
	return nil
}

// deadlines judges the dates of one feed that fell due since the last one that was judged. A feed that was not whole then gets a late
// flag.
func (d *daemon) deadlines(ctx context.Context, feed string, slot time.Time) error {
	c := d.inForce().config
	at := slices.IndexFunc(c.Feeds, func(f rules.Feed) bool { return f.Name == feed })
	if at < 0 || c.Feeds[at].Due == nil {
		return nil
	}
	f := c.Feeds[at]
	since, err := d.ledger.LastSlot(judged + feed)
	if err != nil || since.IsZero() {
		return err
	}
	zone := location(c, f.Due.Timezone)
	var errs []error
	for _, date := range rules.DueBetween(*f.Due, since, slot, zone) {
		due := rules.DueAt(*f.Due, date, zone)
		ok, err := d.deadline(ctx, f, date, due)
		errs = append(errs, err)
		if !ok {
			break // the next pass comes back to it
		}
		if err := d.ledger.Done(judged+feed, due); err != nil {
			return err
		}
	}
	return errors.Join(errs...)
}

// deadline looks once more at what has arrived, then judges whether the feed is whole. A feed that cannot be looked at is not whole.
func (d *daemon) deadline(ctx context.Context, f rules.Feed, date rules.Date, due time.Time) (ok bool, err error) {
	looked := d.pass(ctx, f.Name)
	s, done, err := d.turn(ctx)
	if err != nil {
		return false, err
	}
	defer done()
	p, err := d.newPass(s.config)
	if err == nil {
		err = p.Deadline(f, date, due)
	}
	return err == nil, errors.Join(looked, err)
}

// daily enqueues the line that says that all was checked.
func (d *daemon) daily(ctx context.Context, slot time.Time) error {
	c := d.inForce().config
	if !c.Calendar.Days.Business(rules.DateFrom(slot.In(c.Location))) {
		return nil // a holiday
	}
	s, done, err := d.turn(ctx)
	if err != nil {
		return err
	}
	defer done()
	channels, err := s.post.sender.Health()
	if err != nil {
		return err
	}
	news, err := dayNews(s.config, d.ledger, notify.Troubles(channels), slot)
	if err != nil {
		return err
	}
	return errors.Join(d.ledger.Add(s.teller.Daily(news)), escalate(s.config, d.ledger, s.teller, slot))
}

// newPass is a pass that goes on from what the one before left in memory.
func (d *daemon) newPass(c *config.Config) (*watcher.Pass, error) {
	p, err := d.program.newPass(c, d.ledger)
	if err == nil {
		p.Resident = &d.kept
	}
	return p, err
}
