package notify

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"strayd/rules"
)

// memory is an outbox without a disk.
type memory struct {
	mu      sync.Mutex
	rows    []rules.Notice
	before  func(n rules.Notice) error // of a mark; an error refuses it
	trouble error                      // of every reading call
}

var errFrozen = errors.New("crashed")

func (m *memory) Add(ns []rules.Notice) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, n := range ns {
		if slices.ContainsFunc(m.rows, func(r rules.Notice) bool { return r.Key == n.Key }) {
			continue
		}
		n.Number = uint64(len(m.rows) + 1)
		m.rows = append(m.rows, n)
	}
	return nil
}

func (m *memory) Next(channel string) (rules.Notice, bool, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, r := range m.rows {
		if r.Channel == channel && r.State == rules.NoticeWaiting {
			return r, true, m.trouble
		}
	}
	return rules.Notice{}, false, m.trouble
}

func (m *memory) Waiting(channel string) (out []rules.Notice, err error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, r := range m.rows {
		if r.Channel == channel && r.State == rules.NoticeWaiting {
			out = append(out, r)
		}
	}
	return out, m.trouble
}

func (m *memory) Sending(channel string) (out []rules.Notice, err error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, r := range m.rows {
		if r.Channel == channel && r.State == rules.NoticeSending {
			out = append(out, r)
		}
	}
	return out, m.trouble
}

func (m *memory) Mark(n rules.Notice) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.before != nil {
		if err := m.before(n); err != nil {
			return err
		}
	}
	m.rows[n.Number-1] = n
	return nil
}

func (m *memory) Depth(channel string) (waiting, failed int, oldest time.Time, err error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, r := range m.rows {
		if r.Channel != channel {
			continue
		}
		switch r.State {
		case rules.NoticeWaiting, rules.NoticeSending:
			if waiting++; waiting == 1 {
				oldest = r.Made
			}
		case rules.NoticeFailed:
			failed++
		}
	}
	return waiting, failed, oldest, m.trouble
}

func (m *memory) Notices(each func(rules.Notice) bool) error {
	for _, r := range m.all() {
		if !each(r) {
			break
		}
	}
	return nil
}

func (m *memory) all() []rules.Notice {
	m.mu.Lock()
	defer m.mu.Unlock()
	return slices.Clone(m.rows)
}

func (m *memory) states() string {
	var words []string
	for _, r := range m.all() {
		words = append(words, string(r.State))
	}
	return strings.Join(words, " ")
}

// fill puts notices of a channel into the outbox.
func (m *memory) fill(channel string, count int) {
	for range count {
		i := len(m.all()) + 1
		_ = m.Add([]rules.Notice{{Key: fmt.Sprint("key", i), Channel: channel, Kind: rules.KindBreach, Made: now(), Next: now(),
			State: rules.NoticeWaiting, Lines: []string{fmt.Sprint("n", i)}}})
	}
}

// chat is a channel that does what its script says, then succeeds. It counts what arrives.
type chat struct {
	mu      sync.Mutex
	script  []func(context.Context, rules.Notice) (arrives bool, err error)
	posts   []string // "first line@seconds since the start" of each call
	arrived []uint64
	plain   []uint64
	start   time.Time
	pace    time.Duration
}

func newChat(script ...func(context.Context, rules.Notice) (bool, error)) *chat {
	return &chat{script: script, start: time.Now()}
}

func (c *chat) Pace() time.Duration { return c.pace }

func (c *chat) Post(ctx context.Context, n rules.Notice) (string, error) {
	c.mu.Lock()
	c.posts = append(c.posts, fmt.Sprintf("%s@%g", n.Lines[0], time.Since(c.start).Seconds()))
	step := func(context.Context, rules.Notice) (bool, error) { return true, nil }
	if len(c.script) > 0 {
		step, c.script = c.script[0], c.script[1:]
	}
	c.mu.Unlock()
	arrives, err := step(ctx, n)
	c.mu.Lock()
	defer c.mu.Unlock()
	if arrives {
		c.arrived = append(c.arrived, n.Number)
	}
	return fmt.Sprint("receipt", n.Number), err
}

// fails is a step of a script: the notice does not arrive, with an error of this class.
func fails(c Class, after time.Duration) func(context.Context, rules.Notice) (bool, error) {
	return func(context.Context, rules.Notice) (bool, error) {
		return false, &Failure{c, after, string(c) + " told"}
	}
}

// lost is a step of a script: the notice arrives, and its answer is lost.
func lost(context.Context, rules.Notice) (bool, error) {
	return true, &Failure{Class: Ambiguous, Reason: "answer lost"}
}

// finder is a chat that can tell what has arrived; plainer one that takes bare text.
type finder struct {
	*chat
	blind bool
	asked int
}

func (f *finder) Find(_ context.Context, n rules.Notice) (Found, string) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.asked++
	switch {
	case f.blind:
		return FoundUnknown, ""
	case slices.Contains(f.arrived, n.Number):
		return FoundThere, "found"
	}
	return FoundNot, ""
}

type plainer struct {
	*chat
	err error
}

func (p *plainer) PostPlain(_ context.Context, n rules.Notice) (string, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.plain = append(p.plain, n.Number)
	return "plain", p.err
}

// none and full are the two ends of a jitter.
func none(time.Duration) time.Duration   { return 0 }
func full(d time.Duration) time.Duration { return d }

// bubble runs a test on a clock of its own.
func bubble(t *testing.T, test func(t *testing.T)) {
	t.Helper()
	synctest.Test(t, test)
}

// sendFor runs a sender for a while, then stops it, and gives what it reported.
func sendFor(d time.Duration, o Sending) (*Sender, []Event) {
	var mu sync.Mutex
	var events []Event
	o.Report = func(e Event) {
		mu.Lock()
		defer mu.Unlock()
		events = append(events, e)
	}
	if o.Jitter == nil {
		o.Jitter = none
	}
	s := NewSender(o)
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan struct{})
	go func() { s.Run(ctx); close(done) }()
	time.Sleep(d)
	synctest.Wait()
	cancel()
	<-done
	return s, events
}

func equal[T any](t *testing.T, what string, got, want T) {
	t.Helper()
	if g, w := fmt.Sprint(got), fmt.Sprint(want); g != w {
		t.Errorf("%s: got %s, want %s", what, g, w)
	}
}
