package notify

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"strayd/rules"
)

func one(to Channel) []Route { return []Route{{Name: "desk", Service: "chat", To: to}} }

func TestFirstInFirstOutAtTheChannelsPace(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, c := &memory{}, newChat()
		c.pace = 1100 * time.Millisecond
		m.fill("desk", 4)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(c)})
		equal(t, "posts", c.posts, []string{"n1@0", "n2@1.1", "n3@2.2", "n4@3.3"})
		equal(t, "states", m.states(), "sent sent sent sent")
		equal(t, "receipt", m.all()[2].Receipt, "receipt3")
	})
}

func TestTheAddedIsSentOnWakingOrWithinAMinute(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, c := &memory{}, newChat()
		s := NewSender(Sending{Outbox: m, Routes: one(c), Jitter: none})
		ctx, cancel := context.WithCancel(context.Background())
		done := make(chan struct{})
		go func() { s.Run(ctx); close(done) }()
		time.Sleep(10 * time.Second)
		m.fill("desk", 1)
		s.Wake()
		s.Wake()
		time.Sleep(5 * time.Second)
		m.fill("desk", 1) // nobody wakes it
		time.Sleep(2 * time.Minute)
		cancel()
		<-done
		equal(t, "posts", c.posts, []string{"n1@10", "n2@70"})
	})
}

func TestRetries(t *testing.T) {
	many := func(n int, c Class) (out []func(context.Context, rules.Notice) (bool, error)) {
		for range n {
			out = append(out, fails(c, 0))
		}
		return out
	}
	bubble(t, func(t *testing.T) { // the spans double from 2 s to 10 min
		m, c := &memory{}, newChat(many(12, Retry)...)
		m.fill("desk", 1)
		sendFor(2*time.Hour, Sending{Outbox: m, Routes: one(c), Jitter: full})
		at := []string{}
		for _, s := range []int{0, 2, 6, 14, 30, 62, 126, 254, 510, 1022, 1622, 2222, 2822} {
			at = append(at, fmt.Sprintf("n1@%d", s))
		}
		equal(t, "posts", c.posts, at)
		equal(t, "attempts", m.all()[0].Attempts, 13)
	})
	bubble(t, func(t *testing.T) { // a named time is kept to, the jitter only adds to it, and the whole channel waits
		for jitter, want := range map[string]string{"none": "[n1@0 n1@30 n2@30]", "full": "[n1@0 n1@33 n2@33]"} {
			m, c := &memory{}, newChat(fails(Retry, 30*time.Second))
			m.fill("desk", 2)
			j := map[string]func(time.Duration) time.Duration{"none": none, "full": full}[jitter]
			sendFor(time.Hour, Sending{Outbox: m, Routes: one(c), Jitter: j})
			equal(t, jitter, fmt.Sprint(c.posts), want)
		}
	})
	bubble(t, func(t *testing.T) { // a stop and a new start make it no shorter
		m, c := &memory{}, newChat(fails(Retry, 30*time.Second))
		m.fill("desk", 1)
		sendFor(time.Second, Sending{Outbox: m, Routes: one(c)})
		sendFor(time.Hour, Sending{Outbox: m, Routes: one(c)})
		equal(t, "posts", c.posts, []string{"n1@0", "n1@30"})
	})
	bubble(t, func(t *testing.T) { // an absurd time is held to a day
		m, c := &memory{}, newChat(fails(Retry, 10000*time.Hour))
		m.fill("desk", 1)
		sendFor(25*time.Hour, Sending{Outbox: m, Routes: one(c)})
		equal(t, "posts", len(c.posts), 2)
	})
	bubble(t, func(t *testing.T) { // an unknown reason: five attempts, then failed; the next is not held up
		m, c := &memory{}, newChat(many(5, "")...)
		m.fill("desk", 2)
		sendFor(time.Hour, Sending{Outbox: m, Routes: one(c), Jitter: full})
		equal(t, "posts", c.posts, []string{"n1@0", "n1@2", "n1@6", "n1@14", "n1@30", "n2@30"})
		equal(t, "states", m.states(), "failed sent")
	})
	bubble(t, func(t *testing.T) { // each notice has five of its own
		script := append(many(4, ""), func(context.Context, rules.Notice) (bool, error) { return true, nil })
		m, c := &memory{}, newChat(append(script, many(4, "")...)...)
		m.fill("desk", 2)
		sendFor(time.Hour, Sending{Outbox: m, Routes: one(c)})
		equal(t, "states", m.states(), "sent sent")
	})
	bubble(t, func(t *testing.T) { // a panic of the channel is one
		c := newChat(func(context.Context, rules.Notice) (bool, error) { panic("boom") })
		m := &memory{}
		m.fill("desk", 1)
		_, events := sendFor(time.Hour, Sending{Outbox: m, Routes: one(c)})
		equal(t, "states", m.states(), "sent")
		equal(t, "reason", events[0].Reason, "panic: boom")
	})
}

func TestDeadForADayAndBack(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, c := &memory{}, newChat()
		back := time.Now().Add(25 * time.Hour)
		down := func(context.Context, rules.Notice) (bool, error) {
			if time.Now().Before(back) {
				return false, &Failure{Class: Retry, Reason: "refused"}
			}
			return true, nil
		}
		for range 1000 {
			c.script = append(c.script, down)
		}
		m.fill("desk", 3)
		sendFor(26*time.Hour, Sending{Outbox: m, Routes: one(c), Jitter: full})
		equal(t, "arrived", c.arrived, []uint64{1, 2, 3})
		equal(t, "states", m.states(), "sent sent sent")
		last := c.posts[len(c.posts)-1]
		if want := "n3 (late: of Sat 2000-01-01 00:00 UTC)@"; !strings.HasPrefix(last, want) {
			t.Errorf("last post %q does not begin with %q", last, want)
		}
	})
	bubble(t, func(t *testing.T) { // after three days a notice has failed; a person can have it sent again
		m, c := &memory{}, newChat()
		m.fill("desk", 1)
		time.Sleep(72*time.Hour + time.Second)
		m.fill("desk", 1)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(c)})
		equal(t, "states", m.states(), "failed sent")
		equal(t, "error", m.all()[0].Error, "not delivered within 72 h; last: never tried")
		time.Sleep(100 * time.Hour)
		if err := m.Mark(Again(m.all()[0], now())); err != nil {
			t.Fatal(err)
		}
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(c)})
		equal(t, "states", m.states(), "sent sent")
		equal(t, "arrived", c.arrived, []uint64{2, 1})
	})
}

func TestDeadChannels(t *testing.T) {
	bubble(t, func(t *testing.T) { // one dead channel: its queue waits, the others go on, a new start tries again
		m, dead, other := &memory{}, newChat(fails(DeadChannel, 0)), newChat()
		m.fill("desk", 2)
		m.fill("other", 1)
		routes := []Route{{Name: "desk", Service: "chat", To: dead}, {Name: "other", Service: "chat", To: other}}
		s, events := sendFor(time.Hour, Sending{Outbox: m, Routes: routes})
		equal(t, "states", m.states(), "waiting waiting sent")
		equal(t, "posts", len(dead.posts), 1)
		health, err := s.Health()
		equal(t, "health error", err, error(nil))
		equal(t, "troubles", Troubles(health), []string{"desk: dead channel told (2 waiting)"})
		equal(t, "alarms", alarms(events), 1)
		sendFor(time.Hour, Sending{Outbox: m, Routes: routes})
		equal(t, "after a new start", m.states(), "sent sent sent")
	})
	bubble(t, func(t *testing.T) { // dead credentials: the whole service stops with one alarm, other services go on
		m, dead, same, console := &memory{}, newChat(fails(DeadAll, 0)), newChat(), newChat()
		m.fill("desk", 1)
		s, events := sendWhile(m, []Route{{Name: "desk", Service: "chat", To: dead}, {Name: "same", Service: "chat", To: same}, {Name: "console", Service: "", To: console}},
			func() {
				time.Sleep(time.Minute)
				m.fill("same", 1)
				m.fill("console", 1)
				time.Sleep(time.Hour)
			})
		equal(t, "states", m.states(), "waiting waiting sent")
		equal(t, "posts of the same service", len(same.posts), 0)
		equal(t, "alarms", alarms(events), 1)
		health, _ := s.Health()
		equal(t, "state", health[1].State, Stopped)
		equal(t, "class", health[1].Class, DeadAll)
		equal(t, "overdue", health[1].Overdue, time.Hour)
		equal(t, "console", health[2].State, Idle)
	})
}

func TestADeadServiceStopsAtOnce(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m := &memory{}
		m.fill("desk", 1)
		routes := []Route{{Name: "desk", Service: "chat", To: newChat(fails(DeadAll, 0))}, {Name: "same", Service: "chat", To: newChat()}}
		s := NewSender(Sending{Outbox: m, Routes: routes})
		ctx, cancel := context.WithCancel(context.Background())
		done := make(chan struct{})
		go func() { s.Run(ctx); close(done) }()
		time.Sleep(time.Second) // less than any nap
		h, err := s.Health()
		equal(t, "same", fmt.Sprint(h[1].State, " ", h[1].Reason, " ", err), "stopped dead service told <nil>")
		cancel()
		<-done
	})
}

// Channels of one service take turns, so that a crash leaves one notice at most in doubt; another service does not wait for them.
func TestTurnsOfAService(t *testing.T) {
	bubble(t, func(t *testing.T) {
		var mu sync.Mutex
		hands, most := map[string]int{}, map[string]int{}
		slow := func(service string) *chat {
			step := func(context.Context, rules.Notice) (bool, error) {
				mu.Lock()
				hands[service]++
				most[service] = max(most[service], hands[service])
				most["both"] = max(most["both"], hands["chat"]+hands["mail"])
				mu.Unlock()
				time.Sleep(time.Minute)
				mu.Lock()
				defer mu.Unlock()
				hands[service]--
				return true, nil
			}
			return newChat(step, step, step)
		}
		m := &memory{}
		for _, name := range []string{"desk", "same", "mail"} {
			m.fill(name, 3)
		}
		sendFor(time.Hour, Sending{Outbox: m, Routes: []Route{{Name: "desk", Service: "chat", To: slow("chat")}, {Name: "same", Service: "chat", To: slow("chat")},
			{Name: "mail", Service: "mail", To: slow("mail")}}})
		equal(t, "states", m.states(), "sent sent sent sent sent sent sent sent sent")
		equal(t, "calls at a time", most, map[string]int{"chat": 1, "mail": 1, "both": 2})
	})
}

func alarms(events []Event) (n int) {
	for _, e := range events {
		if e.Stopped {
			n++
		}
	}
	return n
}

func sendWhile(m *memory, routes []Route, then func()) (*Sender, []Event) {
	var events []Event
	got := make(chan Event, 1000)
	s := NewSender(Sending{Outbox: m, Routes: routes, Jitter: none, Report: func(e Event) { got <- e }})
	ctx, cancel := context.WithCancel(context.Background())
	done := make(chan struct{})
	go func() { s.Run(ctx); close(done) }()
	then()
	synctest.Wait()
	cancel()
	<-done
	close(got)
	for e := range got {
		events = append(events, e)
	}
	return s, events
}

func TestBadMessages(t *testing.T) {
	bubble(t, func(t *testing.T) { // once more as bare text
		m, c := &memory{}, newChat(fails(BadPayload, 0))
		m.fill("desk", 2)
		p := &plainer{chat: c}
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(p)})
		equal(t, "posts", c.posts, []string{"n1@0", "n2@0"})
		equal(t, "plain", c.plain, []uint64{1})
		equal(t, "states", m.states(), "sent sent")
	})
	bubble(t, func(t *testing.T) { // which fails too
		m, c := &memory{}, newChat(fails(BadPayload, 0))
		m.fill("desk", 2)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(&plainer{c, &Failure{Class: BadPayload, Reason: "no"}})})
		equal(t, "plain", c.plain, []uint64{1})
		equal(t, "states", m.states(), "failed sent")
	})
	bubble(t, func(t *testing.T) { // a channel without bare text
		m, c := &memory{}, newChat(fails(BadPayload, 0))
		m.fill("desk", 2)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(c)})
		equal(t, "posts", len(c.posts), 2)
		equal(t, "states", m.states(), "failed sent")
	})
}

func TestLostAnswers(t *testing.T) {
	bubble(t, func(t *testing.T) { // the channel knows that it arrived: one message
		m, f := &memory{}, &finder{chat: newChat(lost)}
		m.fill("desk", 2)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(f)})
		equal(t, "arrived", f.arrived, []uint64{1, 2})
		equal(t, "receipt", m.all()[0].Receipt, "found")
		equal(t, "asked", f.asked, 1)
	})
	bubble(t, func(t *testing.T) { // it knows that it did not: sent without a word
		m, f := &memory{}, &finder{chat: newChat(fails(Ambiguous, 0))}
		m.fill("desk", 1)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(f), Jitter: full})
		equal(t, "posts", f.posts, []string{"n1@0", "n1@2"})
	})
	bubble(t, func(t *testing.T) { // it cannot say: sent as a possible repeat, the order kept
		m, f := &memory{}, &finder{chat: newChat(lost), blind: true}
		m.fill("desk", 2)
		sendFor(time.Minute, Sending{Outbox: m, Routes: one(f), Jitter: full})
		equal(t, "posts", f.posts, []string{"n1@0", "n1 (possible repeat)@2", "n2@2"})
		equal(t, "arrived", f.arrived, []uint64{1, 1, 2})
	})
	bubble(t, func(t *testing.T) { // a service that loses every answer for three days gets few repeats
		m, c := &memory{}, newChat()
		for range 1000 {
			c.script = append(c.script, lost)
		}
		m.fill("desk", 1)
		sendFor(80*time.Hour, Sending{Outbox: m, Routes: one(c), Jitter: func(d time.Duration) time.Duration { return d / 2 }})
		equal(t, "states", m.states(), "failed")
		if n := len(c.arrived); n > 110 { // 10 + 72 h / 45 min = 106
			t.Errorf("%d repeats", n)
		}
	})
}

func TestStop(t *testing.T) {
	slow := func(d time.Duration) func(context.Context, rules.Notice) (bool, error) {
		return func(ctx context.Context, _ rules.Notice) (bool, error) {
			select {
			case <-time.After(d):
				return true, nil
			case <-ctx.Done():
				return false, &Failure{Class: Ambiguous, Reason: "cut off"}
			}
		}
	}
	for _, c := range []struct {
		takes time.Duration
		want  string
		ends  float64
	}{
		{5 * time.Second, "sent waiting", 5},     // the call in hand is finished
		{time.Minute, "waiting waiting", 1 + 10}, // or cut off after the grace
	} {
		bubble(t, func(t *testing.T) {
			m, ch := &memory{}, newChat(slow(c.takes), slow(c.takes))
			m.fill("desk", 2)
			began := time.Now()
			sendFor(time.Second, Sending{Outbox: m, Routes: one(ch)})
			equal(t, "ends", time.Since(began).Seconds(), c.ends)
			equal(t, "states", m.states(), c.want)
			equal(t, "posts", len(ch.posts), 1)
		})
	}
}

func TestErrorsOfTheOutbox(t *testing.T) {
	bubble(t, func(t *testing.T) { // not marked, not sent; not recorded, not sent again
		m, c := &memory{}, newChat()
		m.fill("desk", 2)
		refusals := 4
		m.before = func(n rules.Notice) error {
			if refusals--; refusals >= 0 && refusals != 2 {
				return errors.New("disk full")
			}
			return nil
		}
		_, events := sendFor(10*time.Minute, Sending{Outbox: m, Routes: one(c)})
		equal(t, "posts", c.posts, []string{"n1@10", "n2@30"}) // marked at the second try, recorded at the third
		equal(t, "states", m.states(), "sent sent")
		equal(t, "told", strings.Count(fmt.Sprint(events), "outbox: disk full"), 3)
	})
	bubble(t, func(t *testing.T) { // it cannot be read at first
		m, c := &memory{trouble: errors.New("unreadable")}, newChat()
		m.fill("desk", 1)
		s, _ := sendWhile(m, one(c), func() {
			time.Sleep(15 * time.Second)
			m.mu.Lock()
			m.trouble = nil
			m.mu.Unlock()
			time.Sleep(time.Minute)
		})
		equal(t, "posts", c.posts, []string{"n1@20"})
		h, err := s.Health()
		equal(t, "health", fmt.Sprintf("%d %q %v", h[0].Waiting, h[0].Class, err), `0 "" <nil>`)
	})
}

func TestNoticesOfAChannelThatIsGone(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, c := &memory{}, newChat()
		m.fill("gone", 1)
		m.fill("desk", 1)
		_, events := sendFor(time.Minute, Sending{Outbox: m, Routes: one(c)})
		equal(t, "states", m.states(), "failed sent")
		equal(t, "told", events[0].Reason, "the configuration has no such channel any more")
	})
}

func TestHoursHold(t *testing.T) {
	bubble(t, func(t *testing.T) { // the bubble's clock starts at midnight UTC
		m, c := &memory{}, newChat()
		m.fill("desk", 1)
		test := rules.Notice{Key: "test", Channel: "other", Kind: rules.KindTest, Made: now(), State: rules.NoticeWaiting, Lines: []string{"test"}}
		_ = m.Add([]rules.Notice{test})
		other := newChat()
		hours := Hours{From: 7 * 60, To: 19 * 60}
		s, _ := sendFor(time.Hour, Sending{Outbox: m, Routes: []Route{{Name: "desk", To: c, Hours: hours}, {Name: "other", To: other, Hours: hours}}})
		h, _ := s.Health()
		equal(t, "state", fmt.Sprintf("%s %s", h[0].State, h[0].Overdue), "held 0s")
		equal(t, "a test is not held", len(other.posts), 1)
		sendFor(7*time.Hour, Sending{Outbox: m, Routes: []Route{{Name: "desk", Service: "", To: c, Hours: hours}, {Name: "other", Service: "", To: other, Hours: hours}}})
		equal(t, "posts", c.posts, []string{"n1@25200"}) // 07:00
	})
}
