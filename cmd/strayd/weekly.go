package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/notify"
	"strayd/notify/weekly"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
	"strayd/watcher/schedule"
)

func (a *app) weeklyCommand() *cobra.Command {
	var format string
	var archive, send bool
	cmd := &cobra.Command{
		Use:   "weekly [WEEK]",
		Short: "The weekly log, for those who answer for the ranges",
		Long: `What was checked, flagged, decided and delivered in one week beside the week before, and whether the ranges keep what they promise.
WEEK is such as 2026-W11, or a date in it; when left out, the newest week of which more than half is over. A week takes what becomes
known until the end of the Monday after it: from then on its log is the same whenever it is made.

The HTML form is one page to print. With --archive it is kept, with text and CSV, in the folder weekly beside the ledger; what is there
already stays as it is. The configuration's weekly key has the daemon make, keep and post the log by schedule.

` + caution,
		Example: "  strayd weekly\n  strayd weekly 2026-W11 --format html > log.html\n  strayd weekly --archive",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			week := ""
			if len(args) == 1 {
				week = args[0]
			}
			return a.weekly(week, format, archive, send)
		},
	}
	cmd.Flags().StringVar(&format, "format", "text", "`FORMAT`: text, html or csv")
	cmd.Flags().BoolVar(&archive, "archive", false, "keep it beside the ledger instead of printing it")
	cmd.Flags().BoolVar(&send, "send", false, "keep it, and post it to the weekly log's channels; a week is posted once")
	return beside(cmd)
}

// weeklyForms are the forms of the log by their name, which is also the ending of their file.
var weeklyForms = []struct {
	format, ending string
	write          func(io.Writer, *rules.WeekLog) error
}{{"text", "txt", weekly.Text}, {"html", "html", weekly.HTML}, {"csv", "csv", weekly.CSV}}

func (a *app) weekly(week, format string, archive, send bool) error {
	var write func(io.Writer, *rules.WeekLog) error
	for _, f := range weeklyForms {
		if f.format == format {
			write = f.write
		}
	}
	if write == nil {
		return usagef("--format %q: need text, html or csv", format)
	}
	now, err := a.now()
	if err != nil {
		return err
	}
	mode := ledger.ReadOnly
	if send {
		mode = ledger.ReadWrite
	}
	return a.withLedger(mode, func(c *config.Config, l *ledger.Ledger) error {
		monday := rules.WeekNow(now, c.Location)
		if week != "" {
			if monday, err = rules.ParseWeek(week); err != nil {
				return usageError{err}
			}
		}
		made := weekMaking{ctx: a.ctx, config: c, ledger: l, monday: monday, now: now, by: a.person().String(), progress: a.weekProgress()}
		log, err := made.log()
		switch {
		case err != nil:
			return err
		case !archive && !send:
			return write(a.out, log)
		}
		page, err := a.keepWeek(c, log)
		if err != nil || !send {
			return err
		}
		return a.sendWeek(c, l, log, page, now)
	})
}

// keepWeek keeps a log and says where its page is.
func (a *app) keepWeek(c *config.Config, log *rules.WeekLog) (page string, err error) {
	page, fresh, err := keepWeek(c, log)
	if err != nil {
		return page, err
	}
	if !fresh {
		fmt.Fprintf(a.err, "strayd: the log of %s is kept already and stays as it is\n", log.Now.Span.Name())
	}
	_, err = fmt.Fprintln(a.out, page)
	return page, err
}

// sendWeek posts a log, or has the daemon do so.
func (a *app) sendWeek(c *config.Config, l *ledger.Ledger, log *rules.WeekLog, page string, now time.Time) error {
	post := func() error { return l.Add(newTeller(c, nil).Weekly(weekNotice(c, log, page, now))) }
	if a.held != nil {
		return a.inTurn(c, post)
	}
	return errors.Join(post(), a.deliver(c, l))
}

func (a *app) weekProgress() func(work string, done, total int64) {
	bars := newBars(a.err)
	return func(work string, done, total int64) {
		if bars.progress(work, done, total); done == total {
			bars.clear()
		}
		if a.held != nil {
			a.held.beats.beat()
		}
	}
}

// weekMaking is one weekly log on its way.
type weekMaking struct {
	ctx      context.Context
	config   *config.Config
	ledger   *ledger.Ledger
	monday   rules.Date
	now      time.Time
	by       string
	progress func(work string, done, total int64)
}

// log reads the week and the one before from one reading.
func (m *weekMaking) log() (*rules.WeekLog, error) {
	span := rules.NewWeekSpan(m.monday, m.now, m.config.Location)
	if span.Start.After(m.now) {
		return nil, usagef("week %s has not begun", span.Name())
	}
	_, owners, err := settings(m.config)
	if err != nil {
		return nil, err
	}
	v, err := m.ledger.Read()
	if err != nil {
		return nil, err
	}
	defer v.Close() //nolint:errcheck // only read
	ask := watcher.WeekAsk{Zone: m.config.Location, Groups: m.config.Groups, Feeds: m.config.Feeds, Due: m.slots, Progress: m.progress}
	if owners != nil {
		ask.Owner = func(series string) string { return owners[series] }
	}
	var facts []*rules.WeekFacts
	for _, s := range []rules.WeekSpan{span, span.Before(m.config.Location)} {
		ask.Span = s
		f, err := watcher.WeekFacts(m.ctx, chronicle{v}, ask)
		if err != nil {
			return nil, err
		}
		facts = append(facts, f)
	}
	log := rules.NewWeekLog(facts[0], facts[1])
	log.Made, log.By, log.Program = m.now, m.by, version
	return log, nil
}

// slots is how many passes the feeds' schedules have in a time.
func (m *weekMaking) slots(from, to time.Time) (n int) {
	for _, f := range m.config.Feeds {
		if f.Schedule == "" {
			continue
		}
		s, err := schedule.Parse(f.Schedule, m.config.Location)
		if err != nil {
			continue // the configuration's own check has said so
		}
		for t := s.Next(from.Add(-time.Second)); !t.IsZero() && t.Before(to); t = s.Next(t) {
			n++
		}
	}
	return n
}

// chronicle gives the weekly log the entries of the record in plain values.
type chronicle struct{ *ledger.View }

// Entries is the record in plain values.
func (c chronicle) Entries(each func(watcher.RecordEntry, string) bool) error {
	return c.Record(func(e ledger.Entry) bool { return each(e.RecordEntry, fmt.Sprintf("%x", e.Hash)) })
}

// weekFolder is where the logs of a ledger are kept.
func weekFolder(c *config.Config) string { return filepath.Join(filepath.Dir(c.Ledger), "weekly") }

// keepWeek writes every form of a log into the folder beside the ledger. A file that is there already stays as it is; fresh says that the
// page was not there.
func keepWeek(c *config.Config, log *rules.WeekLog) (page string, fresh bool, err error) {
	folder := weekFolder(c)
	if err := os.MkdirAll(folder, 0o750); err != nil {
		return "", false, err
	}
	for _, f := range weeklyForms {
		var b bytes.Buffer
		if err := f.write(&b, log); err != nil {
			return "", false, err
		}
		made, err := keepFile(folder, log.Now.Span.Name()+"."+f.ending, b.Bytes())
		if err != nil {
			return "", false, err
		}
		fresh = fresh || made && f.format == "html"
	}
	return filepath.Join(folder, log.Now.Span.Name()+".html"), fresh, nil
}

// keepFile puts a whole file under a name that is free; made is false where it is not.
func keepFile(folder, name string, content []byte) (made bool, err error) {
	temp, err := os.CreateTemp(folder, name+".*.tmp")
	if err != nil {
		return false, err
	}
	defer os.Remove(temp.Name()) //nolint:errcheck // of no use after the link
	_, err = temp.Write(content)
	if err = errors.Join(err, temp.Chmod(0o640), temp.Sync(), temp.Close()); err != nil {
		return false, err
	}
	err = os.Link(temp.Name(), filepath.Join(folder, name))
	if errors.Is(err, fs.ErrExist) {
		return false, nil
	}
	return err == nil, err
}

// weekly makes the log that is due, keeps it and posts it. A week that was posted is not posted again.
func (d *daemon) weekly(ctx context.Context, slot time.Time) error {
	s := d.inForce()
	defer s.post.Wake()
	if err := d.endWeek(ctx, s, slot); err != nil {
		return err
	}
	m := weekMaking{ctx: ctx, config: s.config, ledger: d.ledger, monday: rules.WeekNow(slot, s.config.Location), now: slot.UTC(),
		by: "the daemon's schedule", progress: func(string, int64, int64) { d.beats.beat() }}
	log, err := m.log()
	if err != nil {
		return err
	}
	page, _, kept := keepWeek(s.config, log) // where that fails, the message goes all the same
	return errors.Join(kept, d.ledger.Add(s.teller.Weekly(weekNotice(s.config, log, page, slot))))
}

// endWeek makes the slow-burn checks that the log lists, as of the log's own time, if no pass has made them.
func (d *daemon) endWeek(ctx context.Context, s *setup, slot time.Time) error {
	release, err := d.alone(ctx)
	if err != nil {
		return err
	}
	defer release()
	p, err := d.newPass(s.config)
	if err != nil {
		return err
	}
	p.Now, p.Report = slot.UTC(), d.logFile
	return p.EndWeek(ctx)
}

func weekNotice(c *config.Config, log *rules.WeekLog, where string, at time.Time) notify.Weekly {
	n := notify.Weekly{At: at, Week: log.Now.Span.Name(), Lines: weekly.Lines(log, where)}
	if c.Weekly != nil {
		n.Channels = c.Weekly.Channels
	}
	return n
}
