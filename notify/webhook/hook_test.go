package webhook

import (
	"context"
	"crypto/tls"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"log"
	"net"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync"
	"testing"
	"time"

	"strayd/notify"
	"strayd/rules"
)

const secret = "0123456789abcdef/secret+of tests"

func dated(y, m, d int) rules.Date {
	date, _ := rules.DateOf(y, m, d)
	return date
}

var notice = rules.Notice{Number: 12, Key: "0f1e2d3c4b5a69788796a5b4c3d2e1f0", Channel: "ops", Kind: rules.KindBreach, Refs: []uint64{7, 9},
	Date: dated(2026, 3, 13), Made: time.Date(2026, 3, 13, 18, 5, 0, 0, time.FixedZone("CET", 3600)),
	Lines: []string{`BREACH <!channel> & "alder" returned -4.12 %, ref 7`, "second \u05d0 line"}}

// receiver stands for the other side: it takes the next step of its script, without one it takes the notice as README.md tells a
// receiver to. It counts what it processed.
type receiver struct {
	*httptest.Server
	mu     sync.Mutex
	script []http.HandlerFunc
	calls  []*http.Request
	bodies []string
	taken  map[string]int // by key
}

func newReceiver(t *testing.T, script ...http.HandlerFunc) *receiver {
	r := &receiver{script: script, taken: map[string]int{}}
	r.Server = httptest.NewServer(http.HandlerFunc(r.serve))
	t.Cleanup(r.Close)
	return r
}

func (r *receiver) serve(w http.ResponseWriter, req *http.Request) {
	body, _ := io.ReadAll(req.Body)
	r.mu.Lock()
	r.calls, r.bodies = append(r.calls, req), append(r.bodies, string(body))
	step := r.standard
	if len(r.script) > 0 {
		step, r.script = r.script[0], r.script[1:]
	}
	r.mu.Unlock()
	step(w, req)
}

// called is how many calls have come.
func (r *receiver) called() int {
	r.mu.Lock()
	defer r.mu.Unlock()
	return len(r.calls)
}

func (r *receiver) standard(w http.ResponseWriter, req *http.Request) {
	r.mu.Lock()
	defer r.mu.Unlock()
	key := req.Header.Get("Idempotency-Key")
	r.taken[key]++
}

func hookOf(t *testing.T, address string, o Options) *Hook {
	t.Helper()
	h, err := New(address, notify.NewSecret(secret), o)
	if err != nil {
		t.Fatal(err)
	}
	return h
}

func answer(status int, body string, headers ...string) http.HandlerFunc {
	return func(w http.ResponseWriter, _ *http.Request) {
		for _, h := range headers {
			name, value, _ := strings.Cut(h, ": ")
			w.Header().Set(name, value)
		}
		w.WriteHeader(status)
		fmt.Fprint(w, body)
	}
}

func hangUp(w http.ResponseWriter, _ *http.Request) {
	if conn, _, err := w.(http.Hijacker).Hijack(); err == nil {
		_ = conn.Close()
	}
}

func class(err error) notify.Class {
	var f *notify.Failure
	if err == nil {
		return ""
	}
	if !errors.As(err, &f) {
		return "no failure"
	}
	return f.Class
}

// The bytes that are sent, and their signature by openssl:
//
//	printf '1773421500.%s' "$BODY" | openssl dgst -sha256 -hmac '0123456789abcdef/secret+of tests'
func TestWhatIsSent(t *testing.T) {
	r := newReceiver(t)
	h := hookOf(t, r.URL+"/in?desk=1", Options{Now: func() time.Time { return time.Unix(1773421500, 0) }})
	if receipt, err := h.Post(t.Context(), notice); receipt != "" || err != nil {
		t.Fatal(receipt, err)
	}
	const want = `{"version":1,"key":"0f1e2d3c4b5a69788796a5b4c3d2e1f0","notice":12,"channel":"ops","for":"","kind":"breach","date":"2026-03-13",` +
		`"refs":[7,9],"made":"2026-03-13T17:05:00Z","repeat":false,"text":"BREACH \u003c!channel\u003e \u0026 \"alder\" returned -4.12 %, ref 7\n` +
		"second \u05d0 line" + `","lines":["BREACH \u003c!channel\u003e \u0026 \"alder\" returned -4.12 %, ref 7","second ` + "\u05d0" + ` line"]}`
	req := r.calls[0]
	if r.bodies[0] != want {
		t.Errorf("body\n got %s\nwant %s", r.bodies[0], want)
	}
	for name, want := range map[string]string{"Content-Type": "application/json", "Strayd-Time": "1773421500", "User-Agent": "strayd",
		"Idempotency-Key": `"0f1e2d3c4b5a69788796a5b4c3d2e1f0"`, "Strayd-Signature": opensslSays} {
		if got := req.Header.Get(name); got != want {
			t.Errorf("%s: %q, want %q", name, got, want)
		}
	}
	if req.Method != "POST" || req.URL.String() != "/in?desk=1" || req.ContentLength != int64(len(want)) {
		t.Errorf("%s %s of %d bytes", req.Method, req.URL, req.ContentLength)
	}
}

// RFC 4231, test case 2, has no full stop in it; this is its key and text cut at the time: HMAC over "1.what do ya want for nothing?" by
// openssl.
func TestSignature(t *testing.T) {
	for _, c := range []struct {
		key  string
		at   int64
		body string
		want string
	}{
		{"Jefe", 1, "what do ya want for nothing?", jefeSays},
		{"Jefe", 1, "", jefeEmpty},
	} {
		if got := Signature(notify.NewSecret(c.key), c.at, []byte(c.body)); got != c.want {
			t.Errorf("%q: %s, want %s", c.body, got, c.want)
		}
	}
}

// A notice without date and refs, one of another channel, one that a person sends again, one that repeats.
func TestForms(t *testing.T) {
	n := rules.Notice{Number: 1, Key: "k", Channel: "b", For: "a", Kind: rules.KindDaily, Date: rules.NoDate, Repeat: true, Lines: []string{""}}
	var got map[string]any
	if err := json.Unmarshal(Body(n), &got); err != nil {
		t.Fatal(err)
	}
	for key, want := range map[string]string{"date": "<nil>", "refs": "[]", "for": "a", "repeat": "true", "key": "k", "text": "", "lines": "[]"} {
		if s := fmt.Sprint(got[key]); s != want {
			t.Errorf("%s: %s, want %s", key, s, want)
		}
	}
	n.Ended = time.Unix(99, 0)
	if err := json.Unmarshal(Body(n), &got); err != nil || got["key"] != "k-99" {
		t.Errorf("sent again under the key %v, %v", got["key"], err)
	}
}

func TestAnswers(t *testing.T) {
	for _, c := range []struct {
		what   string
		step   http.HandlerFunc
		want   notify.Class
		after  time.Duration
		reason string
	}{
		// a success is a success whatever its body
		{"200 with a body", answer(200, `{"ok":false}`), "", 0, ""},
		{"200 with an empty body", answer(200, ""), "", 0, ""},
		{"202", answer(202, ""), "", 0, ""},
		{"204", answer(204, ""), "", 0, ""},
		// a person must put it right
		{"301", answer(301, "", "Location: https://elsewhere.invalid/"), notify.DeadChannel, 0, "HTTP status 301 Moved Permanently"},
		{"307", answer(307, "", "Location: /other"), notify.DeadChannel, 0, "HTTP status 307"},
		{"401", answer(401, "no"), notify.DeadChannel, 0, "the same secret on both sides: no"},
		{"403", answer(403, ""), notify.DeadChannel, 0, "does not take notices from here"},
		{"404", answer(404, "<html>\n  <b>not here</b>"), notify.DeadChannel, 0, "nothing at this address: <html> <b>not here</b>"},
		{"405", answer(405, ""), notify.DeadChannel, 0, "405"},
		{"410", answer(410, ""), notify.DeadChannel, 0, "any more"},
		{"501", answer(501, ""), notify.DeadChannel, 0, "501"},
		// this message is not taken
		{"400", answer(400, `missing "x"`), notify.BadPayload, 0, `400 Bad Request: missing "x"`},
		{"413", answer(413, ""), notify.BadPayload, 0, "413"},
		{"415", answer(415, ""), notify.BadPayload, 0, "415"},
		{"422", answer(422, ""), notify.BadPayload, 0, "422"},
		// it did nothing
		{"425", answer(425, ""), notify.Retry, 0, "425"},
		{"429 with seconds", answer(429, "", "Retry-After: 17"), notify.Retry, 17 * time.Second, "429"},
		{"429 with a date", answer(429, "", "Retry-After: Fri, 13 Mar 2026 17:06:00 GMT"), notify.Retry, time.Minute, "429"},
		{"429 with a past date", answer(429, "", "Retry-After: Fri, 13 Mar 2020 17:06:00 GMT"), notify.Retry, slowDown, "429"},
		{"429 with nonsense", answer(429, "", "Retry-After: soon"), notify.Retry, slowDown, "429"},
		{"429 alone", answer(429, ""), notify.Retry, slowDown, "429"},
		{"503 with seconds", answer(503, "", "Retry-After: 30"), notify.Retry, 30 * time.Second, "503"},
		// it may have done it
		{"408", answer(408, ""), notify.Ambiguous, 0, "408"},
		{"409", answer(409, ""), notify.Ambiguous, 0, "409"},
		{"500", answer(500, "x"), notify.Ambiguous, 0, "500 Internal Server Error: x"},
		{"502", answer(502, "", "Retry-After: 30"), notify.Ambiguous, 0, "502"},
		{"503 alone", answer(503, ""), notify.Ambiguous, 0, "503"},
		{"504", answer(504, ""), notify.Ambiguous, 0, "504"},
		{"599", answer(599, ""), notify.Ambiguous, 0, "HTTP status 599"},
		{"hangs up", hangUp, notify.Ambiguous, 0, "no usable answer: EOF"},
		{"no HTTP", func(w http.ResponseWriter, _ *http.Request) {
			if conn, _, err := w.(http.Hijacker).Hijack(); err == nil {
				_, _ = io.WriteString(conn, "220 mail.example.org\r\n")
				_ = conn.Close()
			}
		}, notify.Ambiguous, 0, "no usable answer"},
		// nothing is known of it
		{"418", answer(418, ""), notify.Unknown, 0, "418"},
		{"402", answer(402, ""), notify.Unknown, 0, "402"},
		{"long", answer(400, strings.Repeat("y", 500)), notify.BadPayload, 0, strings.Repeat("y", 120) + "..."},
		{"broken text", answer(400, "a\xff\x00b"), notify.BadPayload, 0, "a?"},
	} {
		r := newReceiver(t, c.step)
		_, err := hookOf(t, r.URL, Options{Now: func() time.Time { return notice.Made }}).Post(t.Context(), notice)
		var f *notify.Failure
		errors.As(err, &f)
		if class(err) != c.want || f != nil && (f.After != c.after || !strings.Contains(f.Reason, c.reason)) {
			t.Errorf("%s: class %q, %+v", c.what, class(err), f)
		}
		if n := r.called(); n != 1 {
			t.Errorf("%s: %d calls", c.what, n)
		}
	}
}

// Before a connection stands, encrypted where it should be, nothing is sent.
func TestNotReached(t *testing.T) {
	untrusted := httptest.NewUnstartedServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) { t.Error("something was sent") }))
	untrusted.Config.ErrorLog = log.New(io.Discard, "", 0)
	untrusted.StartTLS()
	t.Cleanup(untrusted.Close)
	silent, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = silent.Close() })
	closed := httptest.NewServer(nil)
	closed.Close()
	noName := &http.Transport{DialContext: func(context.Context, string, string) (net.Conn, error) {
		return nil, &net.DNSError{Err: "no such host", Name: "hook.invalid", IsNotFound: true}
	}}
	wrongTLS := &http.Transport{TLSClientConfig: &tls.Config{MinVersion: tls.VersionTLS13, MaxVersion: tls.VersionTLS12}}
	for what, c := range map[string]struct {
		address string
		o       Options
	}{
		"refused":         {closed.URL, Options{}},
		"no such host":    {"https://hook.invalid/", Options{Transport: noName}},
		"certificate":     {untrusted.URL, Options{}},
		"tls version":     {untrusted.URL, Options{Transport: wrongTLS}},
		"silent at hello": {"https://" + silent.Addr().String() + "/", Options{Timeout: 200 * time.Millisecond}},
	} {
		_, err := hookOf(t, c.address+"/place-7", c.o).Post(t.Context(), notice)
		if class(err) != notify.Retry || !strings.HasPrefix(err.Error(), "not reached: ") || strings.Contains(err.Error(), "place-7") {
			t.Errorf("%s: %s: %v", what, class(err), err)
		}
	}
}

// A slow answer, an answer lost after the notice was taken, and a stop: each may have got through. The repeat bears the same key, so the
// receiver knows it for one.
func TestDoubtfulOutcomes(t *testing.T) {
	held := make(chan struct{})
	r := newReceiver(t)
	slow := func(w http.ResponseWriter, req *http.Request) { r.standard(w, req); <-held }
	lost := func(w http.ResponseWriter, req *http.Request) { r.standard(w, req); hangUp(w, req) }
	ctx, cancel := context.WithCancel(t.Context())
	stopped := func(w http.ResponseWriter, req *http.Request) { r.standard(w, req); cancel(); <-held }
	r.script = []http.HandlerFunc{slow, lost, stopped}
	h := hookOf(t, r.URL, Options{Timeout: 300 * time.Millisecond})
	for range 2 {
		if _, err := h.Post(t.Context(), notice); class(err) != notify.Ambiguous {
			t.Errorf("%s: %v", class(err), err)
		}
	}
	if _, err := h.Post(ctx, notice); class(err) != notify.Ambiguous {
		t.Errorf("stopped: %s: %v", class(err), err)
	}
	close(held)
	repeat := notice
	repeat.Repeat = true
	if _, err := h.Post(t.Context(), repeat); err != nil {
		t.Error(err)
	}
	if _, err := h.Post(ctx, notice); class(err) != notify.Retry {
		t.Errorf("stopped before: %s: %v", class(err), err)
	}
	if len(r.taken) != 1 || r.taken[`"`+notice.Key+`"`] != 4 {
		t.Errorf("the receiver has %v", r.taken)
	}
}

// A redirect is not followed: the notice would go elsewhere.
func TestNoRedirects(t *testing.T) {
	other := newReceiver(t)
	r := newReceiver(t, func(w http.ResponseWriter, req *http.Request) {
		http.Redirect(w, req, other.URL, http.StatusTemporaryRedirect)
	})
	if _, err := hookOf(t, r.URL, Options{}).Post(t.Context(), notice); class(err) != notify.DeadChannel || len(other.calls) > 0 {
		t.Errorf("%v, %d calls elsewhere", err, len(other.calls))
	}
}

func TestAddresses(t *testing.T) {
	for address, ok := range map[string]bool{
		"https://notices.example.org/in": true, "https://notices.example.org:8443/in?a=b": true, "http://127.0.0.1:8080/": true, "http://[::1]/": true,
		"http://localhost:1/": true, "http://notices.example.org/in": false, "http://127.0.0.1.example.org/": false, "https://": false, "https://:443/": false,
		"ftp://127.0.0.1/": false, "https://me@notices.example.org/": false, "https://a.example.org/#x": false, "notices.example.org": false, "": false, "://": false,
		"https://a b/": false,
	} {
		_, err := New(address, notify.NewSecret(secret), Options{})
		if (err == nil) != ok || err != nil && len(address) > 8 && strings.Contains(err.Error(), address) {
			t.Errorf("%q: %v", address, err)
		}
	}
	for _, short := range []string{"", "0123456789abcde"} {
		if _, err := New("https://a.example.org/", notify.NewSecret(short), Options{}); err == nil || short != "" && strings.Contains(err.Error(), short) {
			t.Errorf("secret %q: %v", short, err)
		}
	}
}

// Whatever the receiver answers, no error holds the secret, the signature's key or the address beyond its host.
func TestNoErrorHoldsASecret(t *testing.T) {
	const place = "/T0/place-of-its-own?key=ab%2Fcd"
	r := newReceiver(t, answer(400, secret), answer(401, "you sent "+place), answer(500, "x "+secret+" y"), hangUp)
	h := hookOf(t, r.URL+place, Options{})
	var all strings.Builder
	for range 4 {
		_, err := h.Post(t.Context(), notice)
		fmt.Fprintf(&all, "%v %+v %#v\n", err, err, err)
	}
	r.Close()
	_, err := h.Post(t.Context(), notice)
	fmt.Fprintf(&all, "%v\n%v %+v %#v %s\n", err, h, h, h, h)
	if text, err := json.Marshal([]any{h}); err == nil {
		all.Write(text)
	}
	for _, s := range []string{secret, "secret+of", "place-of-its-own", "ab%2Fcd"} {
		if strings.Contains(all.String(), s) {
			t.Errorf("%q shows in\n%s", s, all.String())
		}
	}
	if !strings.Contains(all.String(), "***") {
		t.Error("nothing was hidden, so nothing was tried")
	}
}

// By openssl 3, as the tests that use them say.
const (
	opensslSays = "8e974aec489152ff5a71fad0c1f906414450c8147b0b30599bf2c0d1a69da096"
	jefeSays    = "a9049465ce89cfb8e9aac62333abda66f80e3403f51f57f6bae3c3a4485eca38"
	jefeEmpty   = "c5009ac9fb219943cae5947bf5ea45251fc6f7bb84976c7a02e94799d5d100a9"
)
