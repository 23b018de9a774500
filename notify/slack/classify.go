package slack

import (
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"strconv"
	"strings"
	"time"

	"github.com/slack-go/slack"

	"strayd/notify"
)

// slowDown is how long a channel pauses when the service says "too fast" without saying for how long.
const slowDown = time.Minute

// codes are the classes of the error codes of the service's documentation for posting a message.
var codes = classTable(map[notify.Class]string{
	notify.DeadChannel: `channel_not_found not_in_channel is_archived restricted_action no_permission messages_tab_disabled
		team_access_not_granted ekm_access_denied`,
	notify.DeadAll: `invalid_auth not_authed account_inactive token_revoked token_expired missing_scope not_allowed_token_type
		org_login_required access_denied accesslimited two_factor_setup_required`,
	notify.BadPayload: `invalid_blocks msg_too_long msg_blocks_too_long no_text metadata_too_large too_many_attachments
		cannot_reply_to_message thread_not_found invalid_arguments invalid_charset`,
	notify.Retry:     `ratelimited rate_limited message_limit_exceeded team_added_to_org`,
	notify.Ambiguous: `fatal_error internal_error service_unavailable request_timeout`,
})

// prefixes are codes that come in several variants.
var prefixes = []struct {
	prefix string
	class  notify.Class
}{
	{"restricted_action_", notify.DeadChannel},
	{"invalid_blocks_", notify.BadPayload},
	{"invalid_metadata_", notify.BadPayload},
}

// waits are how long codes that ask to come back later mean.
var waits = map[string]time.Duration{"ratelimited": slowDown, "rate_limited": slowDown, "message_limit_exceeded": time.Hour}

// hints say what a person can do about a code.
var hints = map[string]string{
	"channel_not_found": "the id is wrong, or the app is not in this private channel",
	"not_in_channel":    "invite the app to the channel",
	"is_archived":       "the channel is archived",
	"invalid_auth":      "the token is wrong",
	"not_authed":        "no token arrived",
	"token_revoked":     "the token was revoked",
	"token_expired":     "the token has expired",
	"missing_scope":     "the app lacks a permission",
}

func classTable(lists map[notify.Class]string) map[string]notify.Class {
	out := map[string]notify.Class{}
	for class, list := range lists {
		for _, code := range strings.Fields(list) {
			out[code] = class
		}
	}
	return out
}

// classify says what to do after an error. connected is whether a connection stood, so that the message may have been sent.
func (s *Service) classify(err error, connected bool) *notify.Failure {
	f := classOf(err, connected)
	f.Reason = s.token.Redact(f.Reason)
	return f
}

func classOf(err error, connected bool) *notify.Failure {
	var (
		limited *slack.RateLimitedError
		number  *strconv.NumError
		status  slack.StatusCodeError
		answer  slack.SlackErrorResponse
		address *url.Error
	)
	switch {
	case errors.As(err, &limited):
		return &notify.Failure{Class: notify.Retry, After: max(time.Second, limited.RetryAfter), Reason: "too many messages (429)"}
	case errors.As(err, &number): // of a time to wait that is no whole number
		return &notify.Failure{Class: notify.Retry, After: slowDown, Reason: "too many messages (429, without a readable time to wait)"}
	case errors.As(err, &status):
		return byStatus(status.Code)
	case errors.As(err, &answer):
		return byCode(answer)
	case errors.As(err, &address):
		err = address.Err
	}
	if !connected {
		return &notify.Failure{Class: notify.Retry, Reason: "not reached: " + err.Error()}
	}
	return &notify.Failure{Class: notify.Ambiguous, Reason: "no usable answer: " + err.Error()}
}

// byStatus classes an answer by its HTTP status, which the service's own answers leave at 200.
func byStatus(code int) *notify.Failure {
	f := &notify.Failure{Class: notify.Retry, Reason: strings.TrimSpace(fmt.Sprintf("HTTP status %d %s", code, http.StatusText(code)))}
	switch {
	case code == http.StatusTooManyRequests:
		f.After = slowDown
	case code >= 500 || code == http.StatusRequestTimeout:
		f.Class = notify.Ambiguous
	case code == http.StatusBadRequest || code == http.StatusRequestEntityTooLarge || code < 300:
		f.Class = notify.Unknown
	}
	return f // other 3xx and 4xx: something before the service turned the call away
}

func byCode(r slack.SlackErrorResponse) *notify.Failure {
	f := &notify.Failure{Class: notify.Unknown, After: waits[r.Err], Reason: r.Err}
	if c, ok := codes[r.Err]; ok {
		f.Class = c
	}
	for _, p := range prefixes {
		if strings.HasPrefix(r.Err, p.prefix) {
			f.Class = p.class
		}
	}
	if h := hints[r.Err]; h != "" {
		f.Reason += ": " + h
	}
	if r.Needed != "" {
		f.Reason += " (" + r.Needed + ")"
	}
	if m := r.ResponseMetadata.Messages; len(m) > 0 {
		f.Reason += ": " + strings.Join(m, "; ")
	}
	return f
}
