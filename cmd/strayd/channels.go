package main

import (
	"context"
	"errors"
	"fmt"
	"time"

	"strayd/config"
	"strayd/notify"
	"strayd/notify/mail"
	"strayd/notify/slack"
	"strayd/notify/webhook"
	"strayd/rules"
)

// askTime is how long check waits for a channel.
const askTime = 20 * time.Second

// checkChannels says of each channel what keeps it from delivering; with send, a test notice tells. It counts the tests that failed: a
// service that does not answer says nothing against the configuration.
func (a *app) checkChannels(c *config.Config, send bool) (failed int) {
	to := &addresses{console: a.out}
	for _, ch := range c.Channels {
		said, err := a.askChannel(c, to, ch, send)
		if err != nil {
			said = "does not deliver: " + err.Error()
			if send {
				failed++
			}
		}
		fmt.Fprintf(a.out, "channel %s (%s): %s\n", ch.Name, ch.Kind, printable(said))
	}
	return failed
}

func (a *app) askChannel(c *config.Config, to *addresses, ch rules.Channel, send bool) (said string, err error) {
	ctx, cancel := context.WithTimeout(a.ctx, askTime)
	defer cancel()
	route, err := to.route(ch)
	switch {
	case errors.Is(err, notify.ErrNoCredential) && !send:
		return "not asked: " + err.Error(), nil
	case err != nil:
		return "", err
	case send:
		return a.sendTest(ctx, c, ch, route.To)
	}
	switch to := route.To.(type) {
	case *slack.Channel:
		access, err := to.Check(ctx)
		return access.String(), err
	case *mail.Mailer:
		return to.Check(ctx)
	case *webhook.Hook:
		return "signs with the secret found; whether the receiver answers only --send can tell", nil
	}
	return "prints here, or where the daemon runs", nil
}

// sendTest hands a channel one notice by the way of all others, the outbox apart.
func (a *app) sendTest(ctx context.Context, c *config.Config, ch rules.Channel, to notify.Channel) (said string, err error) {
	receipt, err := to.Post(ctx, newTeller(c, nil).Test(ch, time.Now()))
	var f *notify.Failure
	switch {
	case errors.As(err, &f):
		return "", fmt.Errorf("%s: %w", f.Class, f)
	case err != nil:
		return "", err
	case receipt != "":
		return "the test arrived as " + receipt, nil
	}
	return "the test arrived", nil
}
