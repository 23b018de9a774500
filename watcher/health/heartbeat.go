package health

import (
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/url"
	"syscall"
	"time"
)

const (
	heartbeatTime = 10 * time.Second
	// heartbeatBody bounds how much of an answer is read.
	heartbeatBody = 64 << 10
)

// Secret is a text that nothing prints: not fmt, not a logger, not JSON, not even from within another value.
type Secret struct{ open func() string } // a function, because fmt prints the unexported fields of other values without asking

// NewSecret hides a text.
func NewSecret(s string) Secret { return Secret{func() string { return s }} }

const hidden = "***"

func (s Secret) String() string               { return hidden }
func (s Secret) MarshalText() ([]byte, error) { return []byte(hidden), nil }

// Empty says whether there is nothing to hide.
func (s Secret) Empty() bool { return s.open == nil || s.open() == "" }

// errHeartbeatURL says nothing of the address, which may be a secret all of it.
var errHeartbeatURL = errors.New("heartbeat: the address is not of the form https://host/path")

// CheckHeartbeat refuses an address that no heartbeat can go to. Its error does not repeat the address.
func CheckHeartbeat(address Secret) error {
	if address.Empty() {
		return errHeartbeatURL
	}
	u, err := url.Parse(address.open())
	if err != nil || (u.Scheme != "https" && u.Scheme != "http") || u.Hostname() == "" {
		return errHeartbeatURL
	}
	return nil
}

// Heartbeat asks for an address, whose keeper raises the alarm when nobody does for a while: a daemon that is dead cannot say so.
// Any answer of 200 to 299 within 10 seconds will do. It follows no redirect, which would tell the address to another host. Its
// error names what went wrong in words of its own and nothing of the address.
func Heartbeat(ctx context.Context, address Secret) error {
	return heartbeat(ctx, address, http.DefaultTransport)
}

func heartbeat(ctx context.Context, address Secret, by http.RoundTripper) error {
	if err := CheckHeartbeat(address); err != nil {
		return err
	}
	ctx, cancel := context.WithTimeout(ctx, heartbeatTime)
	defer cancel()
	req, err := http.NewRequestWithContext(ctx, http.MethodGet, address.open(), nil)
	if err != nil {
		return errHeartbeatURL
	}
	req.Header.Set("User-Agent", "strayd")
	req.Close = true // the next one is minutes away
	stay := func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse }
	resp, err := (&http.Client{Transport: by, CheckRedirect: stay}).Do(req)
	if err != nil {
		return fmt.Errorf("heartbeat: %s", cause(err))
	}
	defer resp.Body.Close()
	io.CopyN(io.Discard, resp.Body, heartbeatBody) //nolint:errcheck // the status has said it all
	if resp.StatusCode < 200 || resp.StatusCode > 299 {
		return fmt.Errorf("heartbeat: the answer was status %d", resp.StatusCode)
	}
	return nil
}

// cause says what went wrong without repeating an error's text, which may hold the address, its host or where it redirects to.
func cause(err error) string {
	var (
		timeout     net.Error
		name        *net.DNSError
		number      syscall.Errno
		certificate *tls.CertificateVerificationError
	)
	switch {
	case errors.Is(err, context.Canceled):
		return "it was called off"
	case errors.Is(err, context.DeadlineExceeded), errors.As(err, &timeout) && timeout.Timeout():
		return "no answer in time"
	case errors.As(err, &name):
		return "its host's name was not found"
	case errors.As(err, &certificate):
		return "its host's certificate does not hold"
	case errors.As(err, &number):
		return number.Error()
	}
	return "the connection broke"
}
