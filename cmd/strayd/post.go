package main

import (
	"context"
	"io"
	"log/slog"
	"os"
	"sync"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/notify/slack"
	"strayd/rules"
)

// postOffice is the sending loop of a configuration's channels, with what it needs.
type postOffice struct {
	sender *notify.Sender
	cancel context.CancelFunc
	done   chan struct{}
	once   sync.Once
}

// openPost prepares the channels of a configuration. A missing chat token is an error only where a channel needs one.
func openPost(c *config.Config, outbox notify.Outbox, console io.Writer, log *slog.Logger, told func(notify.Event)) (*postOffice, error) {
	teller := newTeller(c, nil)
	s := notify.Sending{Outbox: outbox, Zone: c.Location, Report: func(e notify.Event) {
		logEvent(log, e)
		told(e)
	}}
	var service *slack.Service
	for _, ch := range c.Channels {
		r := notify.Route{Name: ch.Name, Hours: teller.Hours(ch), To: notify.NewConsole(console)}
		if ch.Kind == "slack" {
			var err error
			if service == nil {
				if service, err = openSlack(); err != nil {
					return nil, err
				}
			}
			r.Service, r.To = "slack", service.Channel(ch.Target)
		}
		s.Routes = append(s.Routes, r)
	}
	return &postOffice{sender: notify.NewSender(s), done: make(chan struct{})}, nil
}

// openSlack finds the token. STRAYD_SLACK_URL names another address of the service's methods, for a relay or a test.
func openSlack() (*slack.Service, error) {
	token, err := slack.FindToken(os.Getenv)
	if err != nil {
		return nil, err
	}
	return slack.New(token, slack.Options{URL: os.Getenv("STRAYD_SLACK_URL")})
}

// Start begins to deliver.
func (p *postOffice) Start() {
	ctx, cancel := context.WithCancel(context.Background())
	p.cancel = cancel
	go func() {
		defer close(p.done)
		p.sender.Run(ctx)
	}()
}

// Wake has every channel look at its queue now.
func (p *postOffice) Wake() { p.sender.Wake() }

// Stop ends the delivery: calls in hand may go on for the sender's own grace.
func (p *postOffice) Stop() {
	p.once.Do(func() {
		if p.cancel != nil {
			p.cancel()
			<-p.done
		}
	})
}

// Drain waits until every channel has nothing more to do now, at most for the given time.
func (p *postOffice) Drain(most time.Duration) {
	deadline := time.Now().Add(most)
	for time.Now().Before(deadline) {
		health, err := p.sender.Health()
		if err != nil || !busy(health) {
			return
		}
		time.Sleep(20 * time.Millisecond)
	}
}

// busy says whether a channel has something that it could send without waiting for its hours or for another try.
func busy(channels []notify.Health) bool {
	for _, h := range channels {
		if h.Waiting > 0 && h.State != notify.Held && h.State != notify.Stopped && h.Class == "" {
			return true
		}
	}
	return false
}

func logEvent(log *slog.Logger, e notify.Event) {
	at := []any{"channel", e.Channel, "notice", e.Notice.Number, "kind", e.Notice.Kind}
	switch {
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

// ownersOf is the register's owners by series.
func ownersOf(register []rules.Series) map[string]string {
	owners := map[string]string{}
	for _, s := range register {
		if s.Owner != "" {
			owners[s.ID] = s.Owner
		}
	}
	return owners
}
