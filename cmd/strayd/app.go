package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/calendar"
	"strayd/watcher/desk"
	"strayd/watcher/feed"
	"strayd/watcher/ledger"
	"strayd/watcher/parquet"
	"strayd/watcher/schedule"
	"strayd/watcher/spreadsheet"
)

// app is one command line being carried out.
type app struct {
	ctx        context.Context
	out, err   io.Writer
	configPath string
	nowText    string
	held       *daemon       // the daemon that carries this command out, nil on its own
	who        *rules.Person // who called the daemon
	dir        string        // the caller's folder
	args       []string
	started    bool // a command's own code has begun: errors before it are wrong usage
}

// version is the program's version, kept with every pass.
const version = "0.1"

// now is the clock, or what --now fixed it to.
func (a *app) now() (time.Time, error) {
	if a.nowText == "" {
		return time.Now().UTC().Truncate(time.Millisecond), nil
	}
	for _, layout := range []string{time.RFC3339, "2006-01-02T15:04:05", "2006-01-02 15:04", time.DateOnly} {
		if t, err := time.Parse(layout, a.nowText); err == nil {
			return t.UTC(), nil
		}
	}
	return time.Time{}, usagef("--now %q is not a time such as 2026-03-13 or 2026-03-13T07:00:00Z", a.nowText)
}

// configOptions are what reading a configuration needs from other rooms.
func configOptions() config.Options {
	return config.Options{Cron: schedule.Check, Calendar: calendar.Parse}
}

// load reads the configuration; beside a daemon it is the one in force there.
func (a *app) load() (*config.Config, error) {
	if a.held != nil {
		if a.nowText != "" {
			return nil, usagef("--now does not go with a running daemon, which goes by the clock")
		}
		return a.held.inForce().config, nil
	}
	c, err := config.Load(a.configPath, configOptions())
	if errors.Is(err, os.ErrNotExist) {
		fmt.Fprintf(a.err, "strayd: no configuration %s here; name yours with --config, or have one written with `strayd init FILE...` from sample files\n", a.configPath)
		return nil, quiet{exitConfig}
	}
	return c, err
}

// openLedger opens the configuration's ledger for reading, or for writing.
func openLedger(c *config.Config, mode ledger.Mode) (*ledger.Ledger, error) {
	return ledger.Open(c.Ledger, ledger.Options{Mode: mode})
}

// withLedger loads the configuration, opens its ledger, or takes the daemon's, and calls do with it.
func (a *app) withLedger(mode ledger.Mode, do func(*config.Config, *ledger.Ledger) error) error {
	c, err := a.load()
	if err != nil {
		return err
	}
	if a.held != nil {
		return do(c, a.held.ledger)
	}
	l, err := openLedger(c, mode)
	if err != nil {
		return err
	}
	return errors.Join(do(c, l), l.Close())
}

// reading opens a view of the configuration's ledger and calls do with it.
func (a *app) reading(do func(c *config.Config, v watcher.View) error) error {
	return a.withLedger(ledger.ReadOnly, func(c *config.Config, l *ledger.Ledger) error {
		v, err := l.View()
		if err != nil {
			return err
		}
		defer v.Close() //nolint:errcheck // only read; also when do ends in an internal error, or a daemon could not close its ledger
		return do(c, v)
	})
}

// settings are what decides verdicts, from the configuration and its register, and the owners that the register names by series.
func settings(c *config.Config) (s rules.Settings, owners map[string]string, err error) {
	s = c.Settings()
	if c.Events != "" {
		if s.Events, err = feed.ReadEvents(c.Events); err != nil {
			return s, nil, err
		}
	}
	if c.Series == "" {
		return s, nil, nameDays(c, &s)
	}
	register, err := feed.ReadRegister(c.Series)
	if err != nil {
		return s, nil, err
	}
	owners = map[string]string{}
	for _, r := range register {
		if r.Owner != "" {
			owners[r.ID] = r.Owner
		}
	}
	s.Register(register)
	return s, owners, nameDays(c, &s)
}

// person is who acts: the operating system's user, or the peer of the daemon's socket; never an option.
func (a *app) person() rules.Person {
	if a.who != nil {
		return *a.who
	}
	return desk.PersonOf(os.Getuid())
}

// grids are what opens files that are no text, by the ending of their names.
func grids() map[string]watcher.OpenGrid {
	return map[string]watcher.OpenGrid{".parquet": parquet.Open, ".xlsx": spreadsheet.Open}
}

// source hands the feed room to the pass. Whether a file has settled is told by the real clock too, since files know no --now.
type source struct{}

func (source) Find(f rules.Feed, now time.Time, settled bool) (watcher.Found, error) {
	if real := time.Now(); real.After(now) {
		now = real
	}
	return feed.Find(f, now, settled)
}

func (source) Read(ctx context.Context, c watcher.Candidate, f rules.Feed, names *watcher.Names, now time.Time, progress watcher.Progress) (*watcher.Sheet, error) {
	return feed.Read(ctx, c, f, names, feed.Options{Now: now, Progress: progress, Grids: grids()})
}
