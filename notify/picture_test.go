package notify

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"strayd/rules"
)

// album is a chat that takes pictures too, each as its script says.
type album struct {
	*chat
	how      []func(context.Context) error
	pictures []string
}

func (a *album) Attach(ctx context.Context, n rules.Notice, p *Picture) error {
	a.pictures = append(a.pictures, fmt.Sprintf("%s under %s@%v", p.Name, n.Receipt, time.Since(a.start).Seconds()))
	if len(a.how) == 0 {
		return nil
	}
	how := a.how[0]
	a.how = a.how[1:]
	return how(ctx)
}

func drawn(n rules.Notice) (*Picture, error) {
	return &Picture{Name: fmt.Sprintf("%d.png", n.Number), PNG: []byte{1}}, nil
}

func hangs(ctx context.Context) error {
	<-ctx.Done()
	return ctx.Err()
}

func refuses(c Class, after time.Duration) func(context.Context) error {
	return func(context.Context) error { return &Failure{Class: c, After: after, Reason: "no"} }
}

// Pictures go out beside the words, at the channel's pace, each once.
func TestPicturesFollowTheirMessages(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, a := &memory{}, &album{chat: newChat()}
		a.pace = time.Second
		m.fill("desk", 3)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(a), Picture: drawn})
		equal(t, "posts", a.posts, []string{"n1@0", "n2@1", "n3@2"})
		equal(t, "pictures", a.pictures, []string{"1.png under receipt1@0", "2.png under receipt2@1", "3.png under receipt3@2"})
	})
}

// A picture that hangs, fails or panics costs itself alone: the words go out at the usual times, no picture is tried twice, and each that
// is missing is reported.
func TestPicturesHoldNothingUp(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, a := &memory{}, &album{chat: newChat()}
		a.how = []func(context.Context) error{hangs, refuses(Ambiguous, 0), func(context.Context) error { panic("boom") }}
		m.fill("desk", 5)
		draw := func(n rules.Notice) (*Picture, error) {
			switch n.Number {
			case 4:
				return nil, errors.New("no series")
			case 5:
				panic("pencil broke")
			}
			return drawn(n)
		}
		_, events := sendFor(5*time.Minute, Sending{Outbox: m, Routes: one(a), Picture: draw})
		equal(t, "posts", a.posts, []string{"n1@0", "n2@0", "n3@0", "n4@0", "n5@0"})
		equal(t, "states", m.states(), "sent sent sent sent sent")
		equal(t, "pictures", a.pictures, []string{"1.png under receipt1@0", "2.png under receipt2@20", "3.png under receipt3@20"})
		var lost []string
		for _, e := range events {
			if e.Picture {
				lost = append(lost, fmt.Sprint(e.Notice.Number, " ", e.Reason))
			}
		}
		equal(t, "reported", lost, []string{"1 context deadline exceeded", "2 no", "3 panic: boom", "4 no series", "5 panic: pencil broke"})
	})
}

// A service that asks for patience has none of the pictures meanwhile, one that refuses them none at all; the words go on.
func TestPicturesGiveWay(t *testing.T) {
	for _, c := range []struct {
		how  func(context.Context) error
		want []string
	}{
		{refuses(Retry, 30*time.Second), []string{"1.png under receipt1@0", "3.png under receipt3@60"}},
		{refuses(DeadAll, 0), []string{"1.png under receipt1@0"}},
	} {
		bubble(t, func(t *testing.T) {
			m, a := &memory{}, &album{chat: newChat(), how: []func(context.Context) error{c.how}}
			m.fill("desk", 2)
			s := NewSender(Sending{Outbox: m, Routes: one(a), Picture: drawn, Jitter: none})
			ctx, cancel := context.WithCancel(context.Background())
			done := make(chan struct{})
			go func() { s.Run(ctx); close(done) }()
			time.Sleep(time.Minute)
			m.fill("desk", 1)
			s.Wake()
			synctest.Wait()
			cancel()
			<-done
			equal(t, "states", m.states(), "sent sent sent")
			equal(t, "pictures", a.pictures, c.want)
		})
	}
}

// What may have arrived twice has no picture; a stop leaves a picture in hand its grace and no more.
func TestPicturesAtTheEdges(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, a := &memory{}, &album{chat: newChat(fails(Ambiguous, 0))}
		m.fill("desk", 1)
		sendFor(time.Hour, Sending{Outbox: m, Routes: one(a), Picture: drawn})
		equal(t, "states", m.states(), "sent")
		equal(t, "pictures", len(a.pictures), 0)
	})
	bubble(t, func(t *testing.T) {
		m, a := &memory{}, &album{chat: newChat(), how: []func(context.Context) error{hangs, hangs}}
		m.fill("desk", 2)
		began := time.Now()
		sendFor(time.Second, Sending{Outbox: m, Routes: one(a), Picture: drawn, Grace: 5 * time.Second})
		equal(t, "stopped after", time.Since(began), 6*time.Second)
		equal(t, "pictures", len(a.pictures), 1)
	})
}

// paper is a channel whose messages hold pictures, and which finds the first too large.
type paper struct {
	*chat
	with []string
}

func (p *paper) PostWith(ctx context.Context, n rules.Notice, picture *Picture) (string, error) {
	p.with = append(p.with, picture.Name)
	if n.Number == 1 {
		return "", &Failure{Class: BadPayload, Reason: "552 too large"}
	}
	return p.Post(ctx, n)
}

func (p *paper) PostPlain(ctx context.Context, n rules.Notice) (string, error) { return p.Post(ctx, n) }

// A message with its picture is one attempt; where the service does not take that, the words go alone, and so they do where none can be drawn.
func TestPicturesInMessages(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, p := &memory{}, &paper{chat: newChat()}
		m.fill("desk", 3)
		draw := func(n rules.Notice) (*Picture, error) {
			if n.Number == 3 {
				return nil, nil
			}
			return drawn(n)
		}
		_, events := sendFor(time.Minute, Sending{Outbox: m, Routes: one(p), Picture: draw})
		equal(t, "states", m.states(), "sent sent sent")
		equal(t, "with", p.with, []string{"1.png", "2.png"})
		equal(t, "arrived", p.arrived, []uint64{1, 2, 3})
		for _, e := range events {
			if strings.Contains(e.Reason, "panic") {
				t.Error(e.Reason)
			}
		}
	})
}
