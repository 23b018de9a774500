package slack

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"log/slog"
	"net/url"
	"strings"
	"testing"

	"strayd/notify"
)

func TestSecretsDoNotShow(t *testing.T) {
	s, err := New(notify.NewSecret(token), Options{})
	if err != nil {
		t.Fatal(err)
	}
	c := s.Channel(target)
	held := struct {
		Shown  notify.Secret
		hidden notify.Secret
		c      *Channel
		s      *Service
	}{notify.NewSecret(token), notify.NewSecret(token), c, s}
	for _, v := range []any{notify.NewSecret(token), held, &held, []notify.Secret{notify.NewSecret(token)}, map[string]notify.Secret{"a": notify.NewSecret(token)}, s, c, *c} {
		for _, verb := range []string{"%v", "%+v", "%#v", "%s", "%q", "%x", "%d", "%t"} {
			hides(t, verb, fmt.Sprintf(verb, v))
		}
		if text, err := json.Marshal(v); err == nil {
			hides(t, "json", string(text))
		}
		var logged bytes.Buffer
		for _, h := range []slog.Handler{slog.NewTextHandler(&logged, nil), slog.NewJSONHandler(&logged, nil)} {
			slog.New(h).Info("started", "with", v)
		}
		hides(t, "log", logged.String())
	}
	if text, err := json.Marshal(notify.NewSecret(token)); err != nil || string(text) != `"***"` {
		t.Errorf("json %s, %v", text, err)
	}
	if got := fmt.Sprint(notify.NewSecret(token)); got != "***" {
		t.Errorf("printed %q", got)
	}
}

// hides looks for the token as it is, and as forms and print verbs write it.
func hides(t *testing.T, what, text string) {
	t.Helper()
	for _, form := range []string{token, url.QueryEscape(token), fmt.Sprintf("%x", token), "secret/of"} {
		if strings.Contains(text, form) {
			t.Errorf("%s shows the token: %s", what, text)
		}
	}
}

// Whatever the service answers, and however it repeats the token, no error, event, notice or log line holds it.
func TestNoErrorHoldsTheToken(t *testing.T) {
	f := newFake(t)
	f.then("chat.postMessage",
		answer(200, `{"ok":false,"error":"something_`+token+`"}`),
		answer(200, `{"ok":false,"error":"no_permission","needed":"`+token+`","response_metadata":{"messages":["token=`+url.QueryEscape(token)+`"]}}`),
		answer(200, token), answer(500, token), answer(429, "", "Retry-After: "+token), hangUp)
	c := channelOf(t, f, Options{})
	var all bytes.Buffer
	logger := slog.New(slog.NewJSONHandler(&all, nil))
	for f.count("chat.postMessage") < 6 {
		_, err := c.Post(context.Background(), notice)
		var failure *notify.Failure
		if !errors.As(err, &failure) {
			t.Fatal(err)
		}
		logger.Error("post", "err", err, "failure", failure, "channel", c)
		fmt.Fprintf(&all, "%v %+v %#v\n", err, failure, failure)
	}
	f.then("auth.test", answer(200, `{"ok":false,"error":"`+token+`"}`))
	_, err := c.Check(context.Background())
	fmt.Fprintln(&all, err)
	f.Close()
	_, err = c.Post(context.Background(), notice)
	fmt.Fprintln(&all, err)
	hides(t, "output", all.String())
	if strings.Contains(all.String(), "postMessage") {
		t.Error("an error holds the address called")
	}
	if !strings.Contains(all.String(), "***") {
		t.Error("nothing was hidden, so nothing was tried")
	}
}
