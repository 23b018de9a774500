package webhook

import (
	"net/http"
	"strconv"
	"time"

	"strayd/notify"
)

// slowDown is how long the channel pauses when the receiver says "too fast" without a readable time.
const slowDown = time.Minute

// classes are those of the statuses (RFC 9110; 425 RFC 8470, 429 RFC 6585) that say more than their hundred.
var classes = map[int]notify.Class{
	http.StatusBadRequest:            notify.BadPayload,
	http.StatusRequestEntityTooLarge: notify.BadPayload,
	http.StatusUnsupportedMediaType:  notify.BadPayload,
	http.StatusUnprocessableEntity:   notify.BadPayload,
	http.StatusUnauthorized:          notify.DeadChannel,
	http.StatusForbidden:             notify.DeadChannel,
	http.StatusNotFound:              notify.DeadChannel,
	http.StatusMethodNotAllowed:      notify.DeadChannel,
	http.StatusGone:                  notify.DeadChannel,
	http.StatusRequestTimeout:        notify.Ambiguous,
	http.StatusConflict:              notify.Ambiguous, // an attempt with this key is under way there
	http.StatusMisdirectedRequest:    notify.Retry,
	http.StatusTooEarly:              notify.Retry,
	http.StatusTooManyRequests:       notify.Retry,
	http.StatusNotImplemented:        notify.DeadChannel,
}

// hints say what a person can do about a status.
var hints = map[int]string{
	http.StatusUnauthorized: "the signature was refused: is it the same secret on both sides",
	http.StatusForbidden:    "the receiver does not take notices from here",
	http.StatusNotFound:     "nothing at this address",
	http.StatusGone:         "nothing at this address any more",
}

// byStatus says what to do after an answer that is no success.
func byStatus(resp *http.Response, now time.Time) *notify.Failure {
	status := resp.StatusCode
	class, known := classes[status]
	after := retryAfter(resp.Header.Get("Retry-After"), now)
	switch {
	case status == http.StatusServiceUnavailable && after > 0:
		class = notify.Retry // it says when to come back, so it did nothing
	case known:
	case status >= 500:
		class = notify.Ambiguous
	case status >= 300 && status < 400:
		class = notify.DeadChannel // moved: a person writes the new address into the configuration
	default:
		class = notify.Unknown
	}
	if status == http.StatusTooManyRequests && after == 0 {
		after = slowDown
	}
	if class != notify.Retry {
		after = 0
	}
	return &notify.Failure{Class: class, After: after}
}

// retryAfter reads seconds or a date (RFC 9110, 10.2.3); 0 when there is neither, or no time left.
func retryAfter(text string, now time.Time) time.Duration {
	if s, err := strconv.ParseInt(text, 10, 32); err == nil {
		return max(0, time.Duration(s)*time.Second)
	}
	if t, err := http.ParseTime(text); err == nil {
		return max(0, t.Sub(now))
	}
	return 0
}
