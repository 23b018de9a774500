package main

import (
	"context"
	"fmt"
	"log/slog"
	"os"
	"os/signal"
	"syscall"
	"time"

	"strayd/config"
	"strayd/watcher/health"
)

// signals are those that the daemon minds, caught from its very start: none ends it half way, and none is missed.
type signals struct {
	reload chan os.Signal
	end    chan os.Signal
	gone   chan struct{}
}

func catchSignals() *signals {
	s := &signals{make(chan os.Signal, 1), make(chan os.Signal, 2), make(chan struct{})}
	signal.Ignore(syscall.SIGPIPE) // a console whose reader has gone is a channel that fails, not the end
	signal.Notify(s.reload, syscall.SIGHUP)
	signal.Notify(s.end, os.Interrupt, syscall.SIGTERM)
	go s.second()
	return s
}

// second ends the program at the second signal to end. The first ends the context of the command line.
func (s *signals) second() {
	for range 2 {
		select {
		case <-s.end:
		case <-s.gone:
			return
		}
	}
	slog.New(slog.NewJSONHandler(os.Stderr, nil)).Error("a second signal: ending at once; what was published stands")
	os.Exit(exitFailed)
}

func (s *signals) release() {
	signal.Stop(s.reload)
	signal.Stop(s.end)
	close(s.gone)
}

// reloads says that the daemon is ready once its loop runs, then reads the configuration again at each SIGHUP.
func (d *daemon) reloads(ctx context.Context) {
	select {
	case <-ctx.Done():
		return
	case <-d.beats.begun:
	}
	d.sayReady()
	for {
		select {
		case <-ctx.Done():
			return
		case <-d.signals.reload:
			d.reload(ctx)
		}
	}
}

func (d *daemon) sayReady() {
	c := d.inForce().config
	d.log.Info("running", "ledger", c.Ledger, "feeds", len(c.Feeds), "channels", len(c.Channels))
	if err := health.Ready(); err != nil {
		d.log.Warn("the service manager cannot be told", "error", err)
	}
}

// reload takes a good new configuration over as a whole, and keeps the last good one otherwise.
func (d *daemon) reload(ctx context.Context) {
	health.Reloading()   //nolint:errcheck // nobody to tell
	defer health.Ready() //nolint:errcheck // as above
	err := d.takeOver(ctx)
	d.mu.Lock()
	defer d.mu.Unlock()
	if err != nil {
		d.bad, d.badAt = err.Error(), time.Now()
		d.log.Error("the configuration cannot be taken over: the last good one stays in force", "error", err)
		return
	}
	d.bad, d.badAt = "", time.Time{}
	d.log.Info("configuration read again", "hash", d.setup.hash)
}

// takeOver changes nothing before all of the new setup stands. It waits for the pass under way, whose notices go to the channels that
// it began with.
func (d *daemon) takeOver(ctx context.Context) error {
	old := d.inForce().config
	c, err := config.Load(old.File, configOptions())
	if err != nil {
		return err
	}
	if c.Ledger != old.Ledger {
		return fmt.Errorf("the ledger changed from %s to %s: that takes a restart", old.Ledger, c.Ledger)
	}
	if c.Page.Listen != old.Page.Listen {
		return fmt.Errorf("page.listen changed from %q to %q: that takes a restart", old.Page.Listen, c.Page.Listen)
	}
	next, err := d.prepare(c)
	if err != nil {
		return err
	}
	release, err := d.alone(ctx)
	if err != nil {
		return err
	}
	defer release()
	if err := d.beginDeadlines(c); err != nil {
		return err
	}
	if err := d.loop.Swap(next.jobs); err != nil {
		return err
	}
	d.install(next)
	return nil
}
