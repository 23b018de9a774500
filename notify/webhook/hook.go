package webhook

import (
	"bytes"
	"context"
	"crypto/hmac"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/http/httptrace"
	"net/url"
	"strconv"
	"strings"
	"sync/atomic"
	"time"

	"strayd/notify"
	"strayd/rules"
)

// The headers of a request.
const (
	TimeHeader      = "Strayd-Time"      // of the attempt, in seconds since 1970 UTC
	SignatureHeader = "Strayd-Signature" // see Signature
	KeyHeader       = "Idempotency-Key"  // draft-ietf-httpapi-idempotency-key-header: the same for each attempt
)

// secretLeast is how many characters a secret must have: 16 bytes at random, in hex, are 32.
const secretLeast = 16

// Secret is where the secret is looked for that signs what is sent.
func Secret() notify.Credential {
	return notify.Credential{What: "secret for the webhook", File: "webhook_secret", Variable: "STRAYD_WEBHOOK_SECRET"}
}

// Options of a Hook. The zero value is for use.
type Options struct {
	Timeout   time.Duration     // of one attempt, answer included; 15 s when 0
	Transport http.RoundTripper // for tests; an own one when nil
	Now       func() time.Time  // for tests; the clock when nil
}

// Hook is one address that notices are posted to.
type Hook struct {
	address notify.Secret // since it may be one
	host    string
	secret  notify.Secret
	client  *http.Client
	now     func() time.Time
}

// New prepares a hook; nothing is called yet. The address is https, or http on this machine.
func New(address string, secret notify.Secret, o Options) (*Hook, error) {
	u, err := Address(address)
	if err != nil {
		return nil, err
	}
	if n := len(secret.Reveal()); n < secretLeast {
		return nil, fmt.Errorf("secret for the webhook: it has %d characters, need at least %d", n, secretLeast)
	}
	h := &Hook{address: notify.NewSecret(address), host: u.Host, secret: secret, client: notify.Client(o.Timeout, o.Transport), now: o.Now}
	if h.now == nil {
		h.now = time.Now
	}
	return h, nil
}

// Address checks an address without repeating it.
func Address(address string) (*url.URL, error) {
	u, err := url.Parse(address)
	switch {
	case err != nil || u.Host == "" || u.Hostname() == "":
		return nil, errors.New("address of the webhook: need one such as https://host/path")
	case u.User != nil || u.Fragment != "":
		return nil, errors.New("address of the webhook: a user or a fragment in it; the signature says who sends")
	case u.Scheme == "https" || u.Scheme == "http" && loopback(u.Hostname()):
		return u, nil
	}
	return nil, errors.New("address of the webhook: need https, or http on this machine alone")
}

func loopback(host string) bool {
	ip := net.ParseIP(host)
	return host == "localhost" || ip != nil && ip.IsLoopback()
}

// String names the hook by its host.
func (h *Hook) String() string { return "webhook " + h.host }

// Signature is HMAC-SHA256 (RFC 2104) with the secret over the time, a full stop and the body, in hex.
func Signature(secret notify.Secret, at int64, body []byte) string {
	mac := hmac.New(sha256.New, []byte(secret.Reveal()))
	fmt.Fprintf(mac, "%d.", at)
	mac.Write(body)
	return hex.EncodeToString(mac.Sum(nil))
}

// Post makes one attempt. The receipt is empty: the identity of the notice names it.
func (h *Hook) Post(ctx context.Context, n rules.Notice) (string, error) {
	var connected atomic.Bool
	ctx = httptrace.WithClientTrace(ctx, &httptrace.ClientTrace{GotConn: func(httptrace.GotConnInfo) { connected.Store(true) }})
	req, err := h.request(ctx, n)
	if err != nil {
		return "", &notify.Failure{Class: notify.DeadChannel, Reason: "the address of the webhook cannot be called"}
	}
	resp, err := h.client.Do(req)
	if err != nil {
		return "", h.lost(err, connected.Load())
	}
	defer resp.Body.Close() //nolint:errcheck // only read
	if resp.StatusCode >= 200 && resp.StatusCode < 300 {
		return "", nil
	}
	return "", h.refused(resp)
}

func (h *Hook) request(ctx context.Context, n rules.Notice) (*http.Request, error) {
	body := Body(n)
	req, err := http.NewRequestWithContext(ctx, http.MethodPost, h.address.Reveal(), bytes.NewReader(body))
	if err != nil {
		return nil, err
	}
	at := h.now().Unix()
	req.Header.Set("Content-Type", "application/json")
	req.Header.Set("User-Agent", "strayd")
	req.Header.Set(TimeHeader, strconv.FormatInt(at, 10))
	req.Header.Set(SignatureHeader, Signature(h.secret, at, body))
	req.Header.Set(KeyHeader, `"`+notify.Identity(n)+`"`)
	req.GetBody = nil // no attempt of the library's own
	return req, nil
}

// lost classes an attempt without an answer. Before a connection stood, nothing can have been sent.
func (h *Hook) lost(err error, connected bool) *notify.Failure {
	var address *url.Error
	if errors.As(err, &address) {
		err = address.Err
	}
	f := &notify.Failure{Class: notify.Ambiguous, Reason: "no usable answer: " + err.Error()}
	if !connected {
		f = &notify.Failure{Class: notify.Retry, Reason: "not reached: " + err.Error()}
	}
	f.Reason = h.hide(f.Reason)
	return f
}

// hide takes the secret and the address out of a text.
func (h *Hook) hide(text string) string {
	text = h.secret.Redact(h.address.Redact(text))
	if u, err := url.Parse(h.address.Reveal()); err == nil && len(u.RequestURI()) > 1 {
		text = notify.NewSecret(u.RequestURI()).Redact(text)
	}
	return text
}

// excerptMost is how much of an answer's body is told.
const excerptMost = 120

// refused classes an answer that is no success, and tells how its body begins.
func (h *Hook) refused(resp *http.Response) *notify.Failure {
	f := byStatus(resp, h.now())
	f.Reason = strings.TrimSpace(fmt.Sprintf("HTTP status %d %s", resp.StatusCode, http.StatusText(resp.StatusCode)))
	if hint := hints[resp.StatusCode]; hint != "" {
		f.Reason += ": " + hint
	}
	body, _ := io.ReadAll(io.LimitReader(resp.Body, 4096)) // what came before an error tells enough
	text := []rune(h.hide(strings.ToValidUTF8(strings.Join(strings.Fields(string(body)), " "), "?")))
	if len(text) > excerptMost {
		text = append(text[:excerptMost], []rune("...")...)
	}
	if len(text) > 0 {
		f.Reason += ": " + string(text)
	}
	return f
}
