package main

import (
	"context"
	"fmt"
	"io"
	"log/slog"
	"sync"
	"time"

	"strayd/config"
	"strayd/notify"
)

// postOffice is the sending loop of a configuration's channels, with what it needs.
type postOffice struct {
	sender *notify.Sender
	outbox notify.Outbox
	ctx    context.Context
	cancel context.CancelFunc
	runs   sync.WaitGroup
}

// callGrace is how long a call in hand may go on after a stop.
const callGrace = 5 * time.Second

// mailroom is the ledger as the sending loop needs it.
type mailroom interface {
	notify.Outbox
	viewer
}

// openPost prepares the channels of a configuration. A missing credential is an error only where a channel needs it.
func openPost(c *config.Config, outbox mailroom, console io.Writer, log *slog.Logger, told func(notify.Event)) (*postOffice, error) {
	teller := newTeller(c, nil)
	s := notify.Sending{Outbox: outbox, Zone: c.Location, Grace: callGrace, Picture: pictures(c, outbox), Report: func(e notify.Event) {
		logEvent(log, e)
		told(e)
	}}
	to := &addresses{console: console}
	for _, ch := range c.Channels {
		r, err := to.route(ch)
		if err != nil {
			return nil, fmt.Errorf("channel %s: %w", ch.Name, err)
		}
		r.Hours = teller.Hours(ch)
		s.Routes = append(s.Routes, r)
	}
	p := &postOffice{sender: notify.NewSender(s), outbox: outbox}
	p.ctx, p.cancel = context.WithCancel(context.Background())
	return p, nil
}

// Start begins to deliver.
func (p *postOffice) Start() { p.runs.Go(func() { p.sender.Run(p.ctx) }) }

// Wake has every channel look at its queue now.
func (p *postOffice) Wake() { p.sender.Wake() }

// Stop ends the delivery: calls in hand may go on for callGrace.
func (p *postOffice) Stop() {
	p.cancel()
	p.runs.Wait()
}

// Finish delivers what can go now, for at most the given time, then stops.
func (p *postOffice) Finish(most time.Duration) {
	defer p.Stop()
	for end := time.Now().Add(most); time.Now().Before(end) && p.busy(end); {
		time.Sleep(20 * time.Millisecond)
	}
}

// busy says whether a channel has something that it could send before a time.
func (p *postOffice) busy(before time.Time) bool {
	channels, err := p.sender.Health()
	if err != nil {
		return false
	}
	for _, h := range channels {
		if h.State == notify.Sends {
			return true
		}
		if h.Waiting == 0 || h.State == notify.Held || h.State == notify.Stopped || h.Class != "" && h.Class != notify.BadPayload {
			continue // nothing there, or nothing that goes before its hours or another try
		}
		n, ok, err := p.outbox.Next(h.Channel)
		if err == nil && (!ok || n.Next.Before(before)) { // without a waiting one, a call is in hand
			return true
		}
	}
	return false
}

func logEvent(log *slog.Logger, e notify.Event) {
	at := []any{"channel", e.Channel, "notice", e.Notice.Number, "kind", e.Notice.Kind}
	switch {
	case e.Picture:
		log.Warn("a notice goes without its chart", append(at, "class", e.Class, "reason", e.Reason)...)
	case e.Fallback != "":
		log.Warn("the fallback channel takes a notice over", append(at, "fallback", e.Fallback, "reason", e.Reason)...)
	case e.Stopped:
		log.Error("the channel delivers nothing until the next start or reload; its notices wait", append(at, "class", e.Class, "reason", e.Reason)...)
	case e.Class != "":
		log.Warn("a notice did not arrive", append(at, "class", e.Class, "reason", e.Reason, "attempts", e.Notice.Attempts)...)
	default:
		log.Info("notice sent", at...)
	}
}

// newTeller makes what turns flags into notices. owners is the register by series, nil for none.
func newTeller(c *config.Config, owners map[string]string) *notify.Teller {
	t := &notify.Teller{Channels: c.Channels, Groups: c.Groups, Zone: c.Location}
	if owners != nil {
		t.Owner = func(series string) string { return owners[series] }
	}
	return t
}
