package notify

import (
	"net/http"
	"time"
)

// callMost is how long a call of a service may take where nothing else is asked for.
const callMost = 15 * time.Second

// Client calls a service. It follows no redirect, which would carry credentials or a notice elsewhere, and keeps no connection: one that
// the service closed meanwhile would make the next attempt's outcome doubtful. 0 stands for the usual time, nil for a transport of
// its own.
func Client(timeout time.Duration, rt http.RoundTripper) *http.Client {
	if rt == nil {
		t := http.DefaultTransport.(*http.Transport).Clone()
		t.DisableKeepAlives = true
		rt = t
	}
	if timeout == 0 {
		timeout = callMost
	}
	return &http.Client{Timeout: timeout, Transport: rt,
		CheckRedirect: func(*http.Request, []*http.Request) error { return http.ErrUseLastResponse }}
}
