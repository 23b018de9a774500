package health

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"net/http/httptest"
	"net/url"
	"strings"
	"sync/atomic"
	"syscall"
	"testing"
	"testing/synctest"
	"time"
)

const token = "s3cr3t-t0ken"

// hides fails when a text holds the token or anything else of an address.
func hides(t *testing.T, text string, address string) {
	t.Helper()
	parts := []string{token, address}
	if u, err := url.Parse(address); err == nil && u.Host != "" {
		parts = append(parts, u.Host, u.Hostname())
	}
	for _, p := range parts {
		if p != "" && strings.Contains(text, p) {
			t.Errorf("%q holds %q", text, p)
		}
	}
}

func TestSecretIsNeverPrinted(t *testing.T) {
	s := NewSecret(token)
	type inner struct {
		s Secret
		P *Secret
		E Secret
	}
	in := inner{s, &s, s}
	for _, verb := range []string{"%v", "%+v", "%#v", "%s", "%q", "%x", "%X", "%d", "%t", "%T", "%10s", "%p", "%!"} {
		for _, v := range []any{s, &s, in, &in, []Secret{s}, []inner{in}, map[string]Secret{"a": s}, any(s)} {
			hides(t, fmt.Sprintf(verb, v), "")
		}
	}
	if got := fmt.Sprintf("%v %s", s, s.String()); got != "*** ***" {
		t.Errorf("printed as %q", got)
	}
	for _, v := range []any{s, in, map[string]any{"a": s}} {
		text, err := json.Marshal(v)
		if err != nil || !strings.Contains(string(text), "***") {
			t.Errorf("JSON %s, %v", text, err)
		}
		hides(t, string(text), "")
	}
	var log bytes.Buffer
	for _, h := range []slog.Handler{slog.NewTextHandler(&log, nil), slog.NewJSONHandler(&log, nil)} {
		slog.New(h).Info("a word", "secret", s, "in", in, "pointer", &s)
	}
	hides(t, log.String(), "")
}

func TestHeartbeatAddresses(t *testing.T) {
	for _, good := range []string{"https://example.org/" + token, "http://127.0.0.1:9190/x", "https://user:" + token + "@example.org/?q=1"} {
		if err := CheckHeartbeat(NewSecret(good)); err != nil {
			t.Errorf("%s: %v", good, err)
		}
	}
	if err := CheckHeartbeat(Secret{}); err == nil {
		t.Error("no address is taken")
	}
	for _, bad := range []string{"", token, "ftp://example.org/" + token, "https:///" + token, "https://exa mple.org/" + token, "https://example.org/\x7f" + token,
		"//example.org/" + token, "https://:80/" + token, "file:///etc/" + token, "https://example.org/%zz" + token, "https://[::1/" + token} {
		for _, err := range []error{CheckHeartbeat(NewSecret(bad)), Heartbeat(t.Context(), NewSecret(bad))} {
			if err == nil || !strings.Contains(err.Error(), "https://host/path") {
				t.Errorf("%q: %v", bad, err)
				continue
			}
			hides(t, err.Error(), bad)
		}
	}
}

// keeper answers heartbeats as their query asks it to.
func keeper(asked chan<- string, other string) http.HandlerFunc {
	return func(w http.ResponseWriter, r *http.Request) {
		asked <- r.Method + " " + r.URL.Path + " " + r.Header.Get("User-Agent")
		switch r.URL.Query().Get("do") {
		case "404":
			w.WriteHeader(404)
		case "500":
			http.Error(w, token, 500)
		case "302":
			http.Redirect(w, r, other+"/"+token, http.StatusFound)
		case "204":
			w.WriteHeader(204)
		case "nowhere":
			w.Header().Set("Location", "http://"+token+"\x7f/")
			w.WriteHeader(302)
		case "hang up":
			panic(http.ErrAbortHandler)
		}
	}
}

// Each way to fail, over real connections: the error says which it was and nothing of the address.
func TestHeartbeatOverTheWire(t *testing.T) {
	var elsewhere atomic.Int32
	other := httptest.NewServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) { elsewhere.Add(1) }))
	defer other.Close()
	asked := make(chan string, 100)
	answers := httptest.NewServer(keeper(asked, other.URL))
	defer answers.Close()
	secure := httptest.NewUnstartedServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) {}))
	secure.Config.ErrorLog = slog.NewLogLogger(slog.DiscardHandler, slog.LevelError)
	secure.StartTLS()
	defer secure.Close()
	closed := httptest.NewServer(nil)
	closed.Close()
	for _, c := range []struct{ address, want string }{
		{answers.URL + "/" + token, ""},
		{answers.URL + "/" + token + "?do=204", ""},
		{answers.URL + "/" + token + "?do=404", "heartbeat: the answer was status 404"},
		{answers.URL + "/" + token + "?do=500", "heartbeat: the answer was status 500"},
		{answers.URL + "/" + token + "?do=302", "heartbeat: the answer was status 302"},
		{answers.URL + "/" + token + "?do=nowhere", "heartbeat: "},
		{answers.URL + "/" + token + "?do=hang+up", "heartbeat: the connection broke"},
		{secure.URL + "/" + token, "heartbeat: its host's certificate does not hold"},
		{closed.URL + "/" + token, "heartbeat: " + syscall.ECONNREFUSED.Error()},
	} {
		err := Heartbeat(t.Context(), NewSecret(c.address))
		if c.want == "" {
			if err != nil {
				t.Errorf("%s: %v", c.address, err)
			}
			continue
		}
		if err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.address, err, c.want)
			continue
		}
		hides(t, err.Error(), c.address)
	}
	if elsewhere.Load() != 0 {
		t.Error("the redirect was followed")
	}
	for range len(asked) {
		if a := <-asked; a != "GET /"+token+" strayd" {
			t.Errorf("asked %q", a)
		}
	}
}

// by answers requests without a network.
type by func(*http.Request) (*http.Response, error)

func (f by) RoundTrip(r *http.Request) (*http.Response, error) { return f(r) }

func TestHeartbeatErrorsOfTheNetwork(t *testing.T) {
	const address = "https://" + token + ".example/" + token
	for _, c := range []struct {
		err  error
		want string
	}{
		{&net.OpError{Op: "dial", Err: &net.DNSError{Err: "no such host", Name: token + ".example", IsNotFound: true}}, "heartbeat: its host's name was not found"},
		{&net.OpError{Op: "dial", Err: &net.DNSError{Err: "i/o timeout", Name: token + ".example", IsTimeout: true}}, "heartbeat: no answer in time"},
		{fmt.Errorf("proxyconnect %s: %w", token, syscall.EHOSTUNREACH), "heartbeat: " + syscall.EHOSTUNREACH.Error()},
		{errors.New("a word of " + token), "heartbeat: the connection broke"},
		{fmt.Errorf("%s: %w", token, context.DeadlineExceeded), "heartbeat: no answer in time"},
		{context.Canceled, "heartbeat: it was called off"},
	} {
		err := heartbeat(t.Context(), NewSecret(address), by(func(*http.Request) (*http.Response, error) { return nil, c.err }))
		if err == nil || err.Error() != c.want {
			t.Errorf("%v: %v, want %q", c.err, err, c.want)
		}
	}
}

func TestHeartbeatWaitsForTenSeconds(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		began := time.Now()
		err := heartbeat(t.Context(), NewSecret("https://example.org/"), by(func(r *http.Request) (*http.Response, error) {
			<-r.Context().Done()
			return nil, r.Context().Err()
		}))
		if err == nil || err.Error() != "heartbeat: no answer in time" || time.Since(began) != 10*time.Second {
			t.Errorf("%v after %v", err, time.Since(began))
		}
	})
}

// endless is a body without an end that counts what is read of it.
type endless struct {
	read   int
	closed bool
}

func (e *endless) Read(p []byte) (int, error) { e.read += len(p); return len(p), nil }
func (e *endless) Close() error               { e.closed = true; return nil }

func TestHeartbeatReadsOnlySoMuch(t *testing.T) {
	body := &endless{}
	err := heartbeat(t.Context(), NewSecret("https://example.org/"), by(func(*http.Request) (*http.Response, error) {
		return &http.Response{StatusCode: 200, Body: body, Header: http.Header{}}, nil
	}))
	if err != nil || body.read > 64<<10 || !body.closed {
		t.Errorf("%v; %d bytes read, closed %v", err, body.read, body.closed)
	}
}
