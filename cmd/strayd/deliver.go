package main

import (
	"log/slog"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher/ledger"
)

// deliverTime is how long a command without a daemon tries to deliver; what is left waits.
const deliverTime = 20 * time.Second

// deliver sends what a command without a daemon has made: to the console at once, to other channels by the sending loop. With --now,
// which is for reruns and tests, only the console is told.
func (a *app) deliver(c *config.Config, l *ledger.Ledger) error {
	now, err := a.now()
	if err != nil {
		return err
	}
	others := false
	for _, ch := range c.Channels {
		if ch.Kind != "console" {
			others = true
			continue
		}
		if err := a.toConsole(l, ch, now); err != nil {
			return err
		}
	}
	if !others || a.nowText != "" {
		return nil
	}
	log := slog.New(slog.NewTextHandler(a.err, &slog.HandlerOptions{Level: slog.LevelWarn}))
	post, err := openPost(c, l, a.out, log, func(notify.Event) {})
	if err != nil {
		log.Warn("notices wait", "reason", err)
		return nil
	}
	post.Start()
	post.Finish(deliverTime)
	return nil
}

// toConsole prints every waiting notice of a console channel.
func (a *app) toConsole(l *ledger.Ledger, ch rules.Channel, now time.Time) error {
	console := notify.NewConsole(a.out)
	for {
		n, ok, err := l.Next(ch.Name)
		if err != nil || !ok {
			return err
		}
		n.Attempts++
		n.State, n.Started, n.Ended = rules.NoticeSent, now, now
		if _, err := console.Post(a.ctx, n); err != nil {
			return err
		}
		if err := l.Mark(n); err != nil {
			return err
		}
	}
}
