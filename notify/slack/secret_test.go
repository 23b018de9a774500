package slack

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"log/slog"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"strayd/notify"
)

func TestSecretsDoNotShow(t *testing.T) {
	s, err := New(NewSecret(token), Options{})
	if err != nil {
		t.Fatal(err)
	}
	c := s.Channel(target)
	held := struct {
		Shown  Secret
		hidden Secret
		c      *Channel
		s      *Service
	}{NewSecret(token), NewSecret(token), c, s}
	for _, v := range []any{NewSecret(token), held, &held, []Secret{NewSecret(token)}, map[string]Secret{"a": NewSecret(token)}, s, c, *c} {
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
	if text, err := json.Marshal(NewSecret(token)); err != nil || string(text) != `"***"` {
		t.Errorf("json %s, %v", text, err)
	}
	if got := fmt.Sprint(NewSecret(token)); got != "***" {
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
	if !strings.Contains(all.String(), hidden) {
		t.Error("nothing was hidden, so nothing was tried")
	}
}

func TestFindToken(t *testing.T) {
	dir := t.TempDir()
	write := func(name, text string, mode os.FileMode) string {
		t.Helper()
		file := filepath.Join(dir, name)
		if err := os.WriteFile(file, []byte(text), mode); err != nil {
			t.Fatal(err)
		}
		if err := os.Chmod(file, mode); err != nil {
			t.Fatal(err)
		}
		return file
	}
	check := func(what string, env map[string]string, want, fails string) {
		t.Helper()
		s, err := FindToken(func(name string) string { return env[name] })
		if s.reveal() != want || (err == nil) != (fails == "") || err != nil && !strings.Contains(err.Error(), fails) {
			t.Errorf("%s: %q, %v", what, s.reveal(), err)
		}
		if err != nil {
			hides(t, what, err.Error())
		}
	}
	write("slack_token", token+"\n", 0o600)
	file := write("file", "xoxb-file\r\n", 0o400)
	empty := t.TempDir()
	// the order of places
	check("all three", map[string]string{"CREDENTIALS_DIRECTORY": dir, "STRAYD_SLACK_TOKEN_FILE": file, "STRAYD_SLACK_TOKEN": "xoxb-env"}, token, "")
	check("no credential of that name", map[string]string{"CREDENTIALS_DIRECTORY": empty, "STRAYD_SLACK_TOKEN_FILE": file, "STRAYD_SLACK_TOKEN": "xoxb-env"}, "xoxb-file", "")
	check("environment", map[string]string{"STRAYD_SLACK_TOKEN": "xoxb-env\n"}, "xoxb-env", "")
	check("nowhere", nil, "", "none in the credentials folder")
	// what is refused, without looking further
	both := func(file string) map[string]string {
		return map[string]string{"STRAYD_SLACK_TOKEN_FILE": file, "STRAYD_SLACK_TOKEN": "xoxb-env"}
	}
	check("missing file", both(filepath.Join(dir, "none")), "", "no such file")
	check("a folder", both(dir), "", "not a regular file")
	check("empty", both(write("empty", "\n", 0o600)), "", "is empty")
	check("two words", both(write("words", token+" x", 0o600)), "", "a character that no token has")
	check("two lines", both(write("lines", token+"\n"+token+"\n", 0o600)), "", "a character that no token has")
	check("too large", both(write("large", strings.Repeat("x", 5000), 0o600)), "", "at most 4096 bytes")
	for _, mode := range []os.FileMode{0o640, 0o604, 0o644, 0o660, 0o620} {
		check(fmt.Sprintf("mode %o", mode), both(write("open", token, mode)), "", "may be read by others")
		write("slack_token", token, mode)
		check(fmt.Sprintf("credential of mode %o", mode), map[string]string{"CREDENTIALS_DIRECTORY": dir, "STRAYD_SLACK_TOKEN": "xoxb-env"}, "", "may be read by others")
	}
}
