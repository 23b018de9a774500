package slack

import (
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/url"
	"slices"
	"strings"
	"sync/atomic"
	"time"

	"github.com/slack-go/slack"

	"strayd/notify"
)

// Options of a Service. The zero value is for use.
type Options struct {
	URL       string            // base address of the service's methods; the public one when ""
	Timeout   time.Duration     // of one call, answer included; 15 s when 0
	Transport http.RoundTripper // for tests; an own one when nil
}

// Service is one workspace, reached with one token.
type Service struct {
	api    func() *slack.Client // behind a function, since the client holds the token as plain text
	token  notify.Secret
	scopes atomic.Pointer[[]string] // of the token, as the last answer that said so named them
}

// New prepares a service; nothing is called yet.
func New(token notify.Secret, o Options) (*Service, error) {
	if token.Empty() {
		return nil, errors.New("an empty token for the chat")
	}
	base, err := baseURL(o.URL)
	if err != nil {
		return nil, err
	}
	s := &Service{token: token}
	calls := notify.Client(o.Timeout, o.Transport)
	calls.Transport = bounded{calls.Transport}
	client := slack.New(token.Reveal(), slack.OptionHTTPClient(calls), slack.OptionAPIURL(base),
		slack.OptionOnResponseHeaders(func(_ string, h http.Header) { s.noteScopes(h) }))
	s.api = func() *slack.Client { return client }
	return s, nil
}

func baseURL(given string) (string, error) {
	if given == "" {
		return slack.APIURL, nil
	}
	u, err := url.Parse(given)
	if err != nil || u.Host == "" || u.Scheme != "https" && u.Scheme != "http" || u.User != nil || u.RawQuery != "" {
		return "", errors.New("address of the chat service: need one such as https://host/api/")
	}
	return strings.TrimSuffix(given, "/") + "/", nil // the library joins without looking
}

// answerMost is how much of an answer is read, in bytes.
const answerMost = 8 << 20

// bounded cuts answers off that are longer than any of the service's own.
type bounded struct{ http.RoundTripper }

func (b bounded) RoundTrip(r *http.Request) (*http.Response, error) {
	resp, err := b.RoundTripper.RoundTrip(r)
	if err == nil {
		resp.Body = struct {
			io.Reader
			io.Closer
		}{io.LimitReader(resp.Body, answerMost), resp.Body}
	}
	return resp, err
}

func (s *Service) noteScopes(h http.Header) {
	text := h.Get("X-OAuth-Scopes")
	if text == "" {
		return
	}
	scopes := strings.FieldsFunc(text, func(r rune) bool { return r == ',' || r == ' ' })
	s.scopes.Store(&scopes)
}

// has says whether the token is known to have a scope.
func (s *Service) has(scope string) bool {
	scopes := s.scopes.Load()
	return scopes != nil && slices.Contains(*scopes, scope)
}

// String names the service without its token.
func (s *Service) String() string { return "slack" }

// Channel is one channel of the workspace, by its id.
type Channel struct {
	s  *Service
	id string
}

// Channel is the channel of an id. Names are no ids: the service does not know them here.
func (s *Service) Channel(id string) *Channel { return &Channel{s, id} }

// Pace is the least time between two messages to a channel: the service takes about one a second.
func (c *Channel) Pace() time.Duration { return 1100 * time.Millisecond }

// String names the channel by its id.
func (c *Channel) String() string { return fmt.Sprintf("slack %s", c.id) }
