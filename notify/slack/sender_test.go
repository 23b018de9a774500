package slack

import (
	"context"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"strayd/notify"
	"strayd/rules"
)

// outbox is the least that a Sender needs, with one notice.
type outbox struct {
	mu   sync.Mutex
	n    rules.Notice
	done chan struct{}
}

func (o *outbox) Add([]rules.Notice) error                  { return nil }
func (o *outbox) Sending(string) ([]rules.Notice, error)    { return nil, nil }
func (o *outbox) Waiting(string) ([]rules.Notice, error)    { return nil, nil }
func (o *outbox) Notices(func(rules.Notice) bool) error     { return nil }
func (o *outbox) Depth(string) (int, int, time.Time, error) { return 0, 0, time.Time{}, nil }
func (o *outbox) Next(string) (rules.Notice, bool, error) {
	o.mu.Lock()
	defer o.mu.Unlock()
	n := o.n
	n.Next = time.Time{} // no waiting in a test on a real clock
	return n, n.State == rules.NoticeWaiting, nil
}

func (o *outbox) Mark(n rules.Notice) error {
	o.mu.Lock()
	defer o.mu.Unlock()
	if o.n = n; n.State == rules.NoticeSent || n.State == rules.NoticeFailed {
		close(o.done)
	}
	return nil
}

// quick is a channel without a pace.
type quick struct{ *Channel }

func (quick) Pace() time.Duration { return 0 }

// With the sending loop: an answer that is lost makes no second message where the service can be asked, and one that says so where
// it cannot.
func TestSenderAndServiceTogether(t *testing.T) {
	for _, c := range []struct {
		scopes string
		script []string
		want   []string // what is read in the channel
	}{
		{"chat:write,channels:history,metadata.message:read", []string{"lost"}, []string{"alder"}},
		{"chat:write,channels:history,metadata.message:read", []string{"hang up", "hang up"}, []string{"alder"}},
		{"chat:write", []string{"lost"}, []string{"alder", "alder (possible repeat)"}},
		{"chat:write", []string{"refused"}, []string{"alder"}},
		{"chat:write", []string{"bad", "plain"}, []string{"alder"}},
	} {
		f := newFake(t)
		f.scopes = c.scopes
		for _, s := range c.script {
			switch s {
			case "lost":
				f.then("chat.postMessage", f.lost)
			case "hang up":
				f.then("chat.postMessage", hangUp)
			case "refused":
				f.then("chat.postMessage", answer(200, `{"ok":false,"error":"team_added_to_org"}`))
			case "bad":
				f.then("chat.postMessage", answer(200, `{"ok":false,"error":"invalid_blocks"}`))
			}
		}
		n := notice
		n.State, n.Attempts, n.Lines = rules.NoticeWaiting, 0, []string{"alder"}
		o := &outbox{n: n, done: make(chan struct{})}
		s := notify.NewSender(notify.Sending{Outbox: o, Routes: []notify.Route{{Name: "desk", To: quick{channelOf(t, f, Options{})}}},
			Jitter: func(time.Duration) time.Duration { return 0 }})
		ctx, cancel := context.WithCancel(context.Background())
		stopped := make(chan struct{})
		go func() { s.Run(ctx); close(stopped) }()
		<-o.done
		cancel()
		<-stopped
		var got []string
		for _, m := range f.messages {
			got = append(got, m.Text)
		}
		if !slices.Equal(got, c.want) || o.n.State != rules.NoticeSent || !strings.HasPrefix(o.n.Receipt, target+"/") {
			t.Errorf("%v: %q, %s %q", c.script, got, o.n.State, o.n.Receipt)
		}
	}
}
