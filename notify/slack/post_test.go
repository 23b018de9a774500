package slack

import (
	"context"
	"crypto/tls"
	"errors"
	"io"
	"log"
	"net"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"

	"strayd/notify"
	"strayd/rules"
)

var notice = rules.Notice{Number: 12, Key: "0123456789abcdef", Channel: "desk", Kind: rules.KindBreach,
	Made: time.Now().Add(-time.Minute), Started: time.Now(), Attempts: 1,
	Lines: []string{"BREACH alder returned -4.12 % for Fri 2026-03-13, ref 12", "Expected -1.93 % to +2.04 %", "What is behind it: strayd explain 12"}}

func class(err error) notify.Class {
	var f *notify.Failure
	switch {
	case err == nil:
		return ""
	case errors.As(err, &f):
		return f.Class
	}
	return notify.Unknown
}

func TestPost(t *testing.T) {
	f := newFake(t)
	receipt, err := channelOf(t, f, Options{}).Post(context.Background(), notice)
	if err != nil {
		t.Fatal(err)
	}
	if want := target + "/" + f.messages[0].Stamp; receipt != want {
		t.Errorf("receipt %q, want %q", receipt, want)
	}
	form := f.calls["chat.postMessage"][0]
	for name, want := range map[string]string{"channel": target, "unfurl_links": "false", "unfurl_media": "false", "mrkdwn": "false",
		"text":     strings.Join(notice.Lines, "\n"),
		"metadata": `{"event_type":"strayd_notice","event_payload":{"key":"0123456789abcdef","notice":"12"}}`,
		"blocks": `[{"type":"header","text":{"type":"plain_text","text":"` + notice.Lines[0] + `","emoji":false}},` +
			`{"type":"section","text":{"type":"plain_text","text":"` + notice.Lines[1] + `\n` + notice.Lines[2] + `","emoji":false}}]`,
	} {
		if got := form.Get(name); got != want || len(form[name]) != 1 {
			t.Errorf("%s: got %q, want %q", name, form[name], want)
		}
	}
	if _, err := channelOf(t, f, Options{}).PostPlain(context.Background(), notice); err != nil {
		t.Fatal(err)
	}
	form = f.calls["chat.postMessage"][1]
	if form.Has("blocks") || form.Has("metadata") || form.Get("text") == "" {
		t.Errorf("plain text has %v", form)
	}
}

// The table of the service's error codes, as its documentation of chat.postMessage lists them.
func TestErrorCodes(t *testing.T) {
	for class, list := range map[notify.Class]string{
		notify.DeadChannel: `channel_not_found not_in_channel is_archived restricted_action restricted_action_read_only_channel
			restricted_action_thread_only_channel restricted_action_non_threadable_channel no_permission messages_tab_disabled
			team_access_not_granted ekm_access_denied`,
		notify.DeadAll: `invalid_auth not_authed account_inactive token_revoked token_expired missing_scope not_allowed_token_type
			org_login_required access_denied accesslimited two_factor_setup_required`,
		notify.BadPayload: `invalid_blocks invalid_blocks_format msg_too_long msg_blocks_too_long no_text metadata_too_large
			invalid_metadata_format invalid_metadata_schema too_many_attachments cannot_reply_to_message invalid_arguments invalid_charset`,
		notify.Retry:     `ratelimited rate_limited message_limit_exceeded team_added_to_org`,
		notify.Ambiguous: `fatal_error internal_error service_unavailable request_timeout`,
		notify.Unknown:   `something_new duplicate_message_not_found`,
	} {
		for _, code := range strings.Fields(list) {
			f := newFake(t)
			f.then("chat.postMessage", answer(200, `{"ok":false,"error":"`+code+`"}`))
			checkFailure(t, code, f, Options{}, class, 0, code)
		}
	}
}

// Answers that are none of the service's codes.
func TestOtherAnswers(t *testing.T) {
	html := "<html><body>Please sign in</body></html>"
	for _, c := range []struct {
		what  string
		step  http.HandlerFunc
		class notify.Class
		after time.Duration
	}{
		{"200 {}", answer(200, `{}`), notify.Ambiguous, 0},
		{"200 empty", answer(200, ``), notify.Ambiguous, 0},
		{"200 not ok, no code", answer(200, `{"ok":false}`), notify.Ambiguous, 0},
		{"200 no stamp", answer(200, `{"ok":true,"channel":"C1"}`), notify.Ambiguous, 0},
		{"200 no channel", answer(200, `{"ok":true,"ts":"1.2"}`), notify.Ambiguous, 0},
		{"200 null", answer(200, `null`), notify.Ambiguous, 0},
		{"200 HTML from a proxy", answer(200, html), notify.Ambiguous, 0},
		{"200 of another shape", answer(200, `{"ok":true,"ts":17,"channel":[]}`), notify.Ambiguous, 0},
		{"500", answer(500, html), notify.Ambiguous, 0},
		{"502", answer(502, html), notify.Ambiguous, 0},
		{"503", answer(503, ""), notify.Ambiguous, 0},
		{"504", answer(504, ""), notify.Ambiguous, 0},
		{"408", answer(408, ""), notify.Ambiguous, 0},
		{"429 with a time", answer(429, "", "Retry-After: 30"), notify.Retry, 30 * time.Second},
		{"429 at once", answer(429, "", "Retry-After: 0"), notify.Retry, time.Second},
		{"429 back in time", answer(429, "", "Retry-After: -5"), notify.Retry, time.Second},
		{"429 without a time", answer(429, ""), notify.Retry, time.Minute},
		{"429 with half a second", answer(429, "", "Retry-After: 1.5"), notify.Retry, time.Minute},
		{"429 with a date", answer(429, "", "Retry-After: Fri, 13 Mar 2026 18:05:00 GMT"), notify.Retry, time.Minute},
		{"rate_limited says no time", answer(200, `{"ok":false,"error":"rate_limited"}`), notify.Retry, time.Minute},
		{"hours", answer(200, `{"ok":false,"error":"message_limit_exceeded"}`), notify.Retry, time.Hour},
		{"302 to a sign-in page", answer(302, html, "Location: https://portal.invalid/"), notify.Retry, 0},
		{"307 elsewhere", answer(307, "", "Location: https://elsewhere.invalid/"), notify.Retry, 0},
		{"403 of a proxy", answer(403, html), notify.Retry, 0},
		{"404", answer(404, html), notify.Retry, 0},
		{"407", answer(407, html), notify.Retry, 0},
		{"400", answer(400, html), notify.Unknown, 0},
		{"413", answer(413, html), notify.Unknown, 0},
		{"204", answer(204, ""), notify.Unknown, 0},
		{"the connection is cut", hangUp, notify.Ambiguous, 0},
	} {
		f := newFake(t)
		f.then("chat.postMessage", c.step)
		checkFailure(t, c.what, f, Options{}, c.class, c.after, "")
	}
}

func checkFailure(t *testing.T, what string, f *fake, o Options, want notify.Class, after time.Duration, says string) {
	t.Helper()
	_, err := channelOf(t, f, o).Post(context.Background(), notice)
	var got *notify.Failure
	if !errors.As(err, &got) {
		t.Errorf("%s: %v is no failure", what, err)
		return
	}
	if got.Class != want || after > 0 && got.After != after {
		t.Errorf("%s: got %s after %s (%s), want %s after %s", what, got.Class, got.After, got.Reason, want, after)
	}
	if got.Reason == "" || !strings.Contains(got.Reason, says) || strings.Contains(got.Reason, "\n") || strings.Contains(got.Reason, "html") {
		t.Errorf("%s: reason %q", what, got.Reason)
	}
	if n := f.count("chat.postMessage"); n != 1 {
		t.Errorf("%s: %d calls, want one: the library must not retry", what, n)
	}
}

// What is taken in although its answer does not arrive is ambiguous, and not tried again by itself.
func TestLostAnswers(t *testing.T) {
	for _, what := range []string{"lost", "cut short", "slow"} {
		f := newFake(t)
		held := make(chan struct{})
		steps := map[string]http.HandlerFunc{"lost": f.lost, "cut short": f.cutShort,
			"slow": func(_ http.ResponseWriter, r *http.Request) { f.process(r); <-held }}
		f.then("chat.postMessage", steps[what])
		checkFailure(t, what, f, Options{Timeout: 200 * time.Millisecond}, notify.Ambiguous, 0, "")
		close(held)
		if len(f.messages) != 1 {
			t.Errorf("%s: %d messages", what, len(f.messages))
		}
	}
}

// An attempt that never got as far as a connection did surely not get through.
func TestNotReached(t *testing.T) {
	closed := httptest.NewServer(nil)
	closed.Close()
	untrusted := httptest.NewUnstartedServer(http.NotFoundHandler())
	untrusted.Config.ErrorLog = log.New(io.Discard, "", 0)
	untrusted.StartTLS()
	t.Cleanup(untrusted.Close)
	silent, err := net.Listen("tcp", "127.0.0.1:0") // takes connections and never speaks TLS
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = silent.Close() })
	noName := &http.Transport{DialContext: func(context.Context, string, string) (net.Conn, error) {
		return nil, &net.DNSError{Err: "no such host", Name: "chat.invalid", IsNotFound: true}
	}}
	wrongTLS := &http.Transport{TLSClientConfig: &tls.Config{MinVersion: tls.VersionTLS13, MaxVersion: tls.VersionTLS12}}
	for what, o := range map[string]Options{
		"refused":         {URL: closed.URL},
		"no such host":    {URL: "https://chat.invalid/api/", Transport: noName},
		"certificate":     {URL: untrusted.URL},
		"tls version":     {URL: untrusted.URL, Transport: wrongTLS},
		"silent at hello": {URL: "https://" + silent.Addr().String() + "/", Timeout: 200 * time.Millisecond},
	} {
		s, err := New(notify.NewSecret(token), o)
		if err != nil {
			t.Fatal(err)
		}
		_, err = s.Channel(target).Post(context.Background(), notice)
		if class(err) != notify.Retry || !strings.HasPrefix(err.Error(), "not reached: ") || strings.Contains(err.Error(), "postMessage") {
			t.Errorf("%s: %s: %v", what, class(err), err)
		}
	}
}

func TestStoppedDuringTheCall(t *testing.T) {
	f := newFake(t)
	ctx, cancel := context.WithCancel(context.Background())
	held := make(chan struct{})
	f.then("chat.postMessage", func(_ http.ResponseWriter, r *http.Request) { f.process(r); cancel(); <-held })
	_, err := channelOf(t, f, Options{}).Post(ctx, notice)
	close(held)
	if class(err) != notify.Ambiguous {
		t.Errorf("%s: %v", class(err), err)
	}
	if _, err = channelOf(t, f, Options{}).Post(ctx, notice); class(err) != notify.Retry {
		t.Errorf("stopped before: %s: %v", class(err), err)
	}
}

// A redirect is not followed: the token would go along.
func TestNoRedirects(t *testing.T) {
	reached := false
	other := httptest.NewServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) { reached = true }))
	t.Cleanup(other.Close)
	f := newFake(t)
	f.then("chat.postMessage", func(w http.ResponseWriter, r *http.Request) {
		http.Redirect(w, r, other.URL, http.StatusTemporaryRedirect)
	})
	if _, err := channelOf(t, f, Options{}).Post(context.Background(), notice); class(err) != notify.Retry || reached {
		t.Errorf("%v, reached %v", err, reached)
	}
}

func TestAddresses(t *testing.T) {
	for _, bad := range []string{"chat.invalid", "ftp://chat.invalid/", "https://", "https://user@chat.invalid/", "https://chat.invalid/?a=b", "://"} {
		if _, err := New(notify.NewSecret(token), Options{URL: bad}); err == nil {
			t.Errorf("%q is taken", bad)
		}
	}
	if _, err := New(notify.Secret{}, Options{}); err == nil {
		t.Error("taken without a token")
	}
	for given, want := range map[string]string{"": "https://slack.com/api/", "http://127.0.0.1:1/api": "http://127.0.0.1:1/api/", "https://a.invalid/": "https://a.invalid/"} {
		if got, err := baseURL(given); got != want || err != nil {
			t.Errorf("%q: %q, %v", given, got, err)
		}
	}
}

// Each post has a connection of its own: one kept from before may be closed by the service just then, which would leave it open
// whether the post got through.
func TestAConnectionAPost(t *testing.T) {
	f := newFake(t)
	from := map[string]bool{} // the addresses of our ends
	for range 3 {
		f.then("chat.postMessage", func(w http.ResponseWriter, r *http.Request) { from[r.RemoteAddr] = true; f.standard(w, r) })
	}
	c := channelOf(t, f, Options{})
	for range 3 {
		if _, err := c.Post(context.Background(), notice); err != nil {
			t.Fatal(err)
		}
	}
	if len(from) != 3 {
		t.Errorf("%d connections for 3 posts", len(from))
	}
}
