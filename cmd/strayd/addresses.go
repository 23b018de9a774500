package main

import (
	"errors"
	"io"
	"os"

	"strayd/notify"
	"strayd/notify/mail"
	"strayd/notify/slack"
	"strayd/notify/webhook"
	"strayd/rules"
)

// addresses turns channels of a configuration into what takes their notices. Those of one service share its credentials.
type addresses struct {
	console io.Writer
	service *slack.Service
}

func (a *addresses) route(ch rules.Channel) (r notify.Route, err error) {
	r = notify.Route{Name: ch.Name, Fallback: ch.Fallback, After: ch.After}
	switch ch.Kind {
	case "slack":
		r.Service = "slack"
		r.To, err = a.slack(ch)
	case "webhook":
		r.To, err = openWebhook(ch)
	case "mail":
		r.Service = "mail " + ch.Mail.Server
		r.To, err = openMail(ch.Mail)
	default:
		r.To = notify.NewConsole(a.console)
	}
	return r, err
}

func (a *addresses) slack(ch rules.Channel) (to notify.Channel, err error) {
	if a.service == nil {
		if a.service, err = openSlack(); err != nil {
			return nil, err
		}
	}
	return a.service.Channel(ch.Target), nil
}

// openSlack finds the token. STRAYD_SLACK_URL names another address of the service's methods, for a relay or a test.
func openSlack() (*slack.Service, error) {
	token, err := slack.Token().Find(os.Getenv)
	if err != nil {
		return nil, err
	}
	return slack.New(token, slack.Options{URL: os.Getenv("STRAYD_SLACK_URL")})
}

func openWebhook(ch rules.Channel) (notify.Channel, error) {
	secret, err := webhook.Secret().Find(os.Getenv)
	if err != nil {
		return nil, err
	}
	return webhook.New(ch.Target, secret, webhook.Options{})
}

// openMail finds user and password. Without either, the server is not told who sends.
func openMail(m *rules.Mail) (notify.Channel, error) {
	user, err := mail.User().Find(os.Getenv)
	if err != nil && !errors.Is(err, notify.ErrNoCredential) {
		return nil, err
	}
	password, err := mail.Password().Find(os.Getenv)
	if err != nil && !errors.Is(err, notify.ErrNoCredential) {
		return nil, err
	}
	account := mail.Account{Server: m.Server, Security: mail.Security(m.Security), From: m.From, To: m.To}
	return mail.New(account, user, password, mail.Options{})
}
