package notify

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"strayd/rules"
)

// always is a channel every call of which ends like this.
type always struct {
	calls int
	f     Failure
}

func (a *always) Post(context.Context, rules.Notice) (string, error) {
	a.calls++
	f := a.f
	return "", &f
}

func withFallback(desk, ops Channel, after time.Duration) []Route {
	return []Route{{Name: "desk", To: desk, Fallback: "ops", After: after}, {Name: "ops", To: ops}}
}

// A dead channel's notices go to its fallback, in order, those that come later too; the fallback says for whom.
func TestDeadChannelFallsBack(t *testing.T) {
	for _, class := range []Class{DeadChannel, DeadAll} {
		bubble(t, func(t *testing.T) {
			m, dead, ops := &memory{}, &always{f: Failure{Class: class, Reason: "gone"}}, newChat()
			m.fill("desk", 3)
			m.fill("ops", 1)
			s, events := sendWhile(m, withFallback(dead, ops, time.Hour), func() {
				time.Sleep(time.Minute)
				m.fill("desk", 1)
				time.Sleep(2 * time.Minute)
			})
			equal(t, "states", m.states(), "sent sent sent sent sent")
			equal(t, "arrived", len(slices.Compact(slices.Sorted(slices.Values(ops.arrived)))), 5)
			equal(t, "posts", len(ops.posts), 5)
			equal(t, "calls", dead.calls, 1)
			for _, p := range ops.posts {
				if strings.Contains(p, "(for desk, which does not deliver)") == strings.HasPrefix(p, "n4") {
					t.Errorf("ops is told %q", p)
				}
			}
			if n := slices.IndexFunc(events, func(e Event) bool { return e.Fallback == "ops" && e.Channel == "desk" && e.Notice.Number == 5 }); n < 0 {
				t.Error("nobody is told of the notice handed over")
			}
			health, err := s.Health()
			equal(t, "troubles", Troubles(health), []string{"desk: gone, ops stands in"})
			equal(t, "error", err, error(nil))
			equal(t, "kept for", m.all()[0].For+m.all()[4].For, "deskdesk")
		})
	}
}

// A channel that delivers nothing keeps its notices for the time set. Then the fallback has them, and each new one after one attempt; once
// the channel delivers again, it has its own.
func TestLaggingChannelFallsBack(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, desk, ops := &memory{}, &always{f: Failure{Class: Retry, Reason: "not reached"}}, newChat()
		m.fill("desk", 2)
		swap := &switched{to: desk}
		s, _ := sendWhile(m, withFallback(swap, ops, 20*time.Minute), func() {
			time.Sleep(20*time.Minute - time.Second)
			synctest.Wait()
			equal(t, "before", m.states(), "waiting waiting")
			time.Sleep(2 * time.Minute)
			synctest.Wait()
			equal(t, "after", m.states(), "sent sent")
			calls := desk.calls // nobody posts before the next notice is there
			m.fill("desk", 1)
			time.Sleep(2 * time.Minute)
			synctest.Wait()
			equal(t, "the next", m.states(), "sent sent sent")
			equal(t, "tries", desk.calls-calls, 1)
			swap.to = newChat()
			m.fill("desk", 1)
			time.Sleep(2 * time.Minute)
			synctest.Wait()
			equal(t, "back", swap.to.(*chat).arrived, []uint64{4})
		})
		equal(t, "arrived", ops.arrived, []uint64{1, 2, 3})
		health, _ := s.Health()
		equal(t, "troubles", len(Troubles(health)), 0)
	})
}

type switched struct{ to Channel }

func (s *switched) Pace() time.Duration { return 30 * time.Second }

func (s *switched) Post(ctx context.Context, n rules.Notice) (string, error) {
	return s.to.Post(ctx, n)
}

// The fallback waits for the channel's hours, and for its own.
func TestFallbackKeepsHours(t *testing.T) {
	bubble(t, func(t *testing.T) { // the bubble begins at midnight UTC
		m, ops := &memory{}, newChat()
		m.fill("desk", 1)
		routes := withFallback(&always{f: Failure{Class: DeadChannel}}, ops, time.Minute)
		routes[0].Hours, routes[1].Hours = Hours{From: 8 * 60, To: 18 * 60}, Hours{From: 9 * 60, To: 10 * 60}
		sendFor(24*time.Hour, Sending{Outbox: m, Routes: routes})
		equal(t, "posts", ops.posts, []string{"n1 (for desk, which does not deliver)@32400"})
	})
}

// A paused channel, one with a long queue that moves, one whose notices the fallback has anyhow, one without a fallback: nothing moves.
func TestFallbackLeavesBe(t *testing.T) {
	bubble(t, func(t *testing.T) { // a queue that moves
		m, desk, ops := &memory{}, newChat(), newChat()
		desk.pace = 50 * time.Second
		m.fill("desk", 40)
		sendFor(time.Hour, Sending{Outbox: m, Routes: withFallback(desk, ops, 2*time.Minute)})
		equal(t, "posts of ops", len(ops.posts), 0)
		equal(t, "posts of desk", len(desk.posts), 40)
	})
	bubble(t, func(t *testing.T) { // what the fallback is told anyhow
		m, ops := &memory{}, newChat()
		for i, kind := range []rules.Kind{rules.KindDaily, rules.KindNotice, rules.KindBreach, rules.KindBreach} {
			n := rules.Notice{Key: fmt.Sprint(i), Channel: "desk", Kind: kind, Made: now(), Next: now(), State: rules.NoticeWaiting, Lines: []string{"x"}}
			n.Told = map[int]string{2: "ops"}[i]
			_ = m.Add([]rules.Notice{n})
		}
		sendFor(time.Hour, Sending{Outbox: m, Routes: withFallback(&always{f: Failure{Class: DeadChannel}}, ops, time.Minute)})
		equal(t, "states", m.states(), "waiting waiting waiting sent")
		equal(t, "arrived", ops.arrived, []uint64{4})
	})
	bubble(t, func(t *testing.T) { // after a restart each channel has its chance first
		m, desk, ops := &memory{}, newChat(), newChat()
		m.fill("desk", 1)
		time.Sleep(5 * time.Hour)
		sendFor(time.Hour, Sending{Outbox: m, Routes: withFallback(desk, ops, time.Minute)})
		equal(t, "arrived", desk.arrived, []uint64{1})
	})
}

// A chain goes on to the end; the notice names the channel that it was made for.
func TestFallbackOfAFallback(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, end := &memory{}, newChat()
		m.fill("desk", 1)
		dead := func() Channel { return &always{f: Failure{Class: DeadChannel, Reason: "gone"}} }
		sendFor(time.Hour, Sending{Outbox: m, Routes: []Route{{Name: "desk", To: dead(), Fallback: "ops", After: time.Hour},
			{Name: "ops", To: dead(), Fallback: "end", After: time.Hour}, {Name: "end", To: end}}})
		equal(t, "posts", end.posts, []string{"n1 (for desk, which does not deliver)@0"})
	})
}

// A notice that may have arrived is handed over as a possible repeat.
func TestDoubtfulFallsBack(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, ops := &memory{}, newChat()
		m.fill("desk", 1)
		sendFor(time.Hour, Sending{Outbox: m, Routes: withFallback(&always{f: Failure{Class: Ambiguous}}, ops, time.Minute)})
		equal(t, "arrived", ops.arrived, []uint64{1})
		if !strings.Contains(ops.posts[0], "(possible repeat)") {
			t.Errorf("ops is told %q", ops.posts)
		}
	})
}

// A crash at any mark of a handing over: after the next start each notice is in one queue, and arrives once more or less marked.
func TestCrashesWhileHandingOver(t *testing.T) {
	for at := 1; at <= 16; at++ {
		for _, applied := range []bool{false, true} {
			bubble(t, func(t *testing.T) {
				m, ops := &memory{}, newChat()
				m.fill("desk", 4)
				marks := 0
				m.before = func(rules.Notice) error {
					if marks++; marks >= at && !(marks == at && applied) {
						return errFrozen
					}
					return nil
				}
				dead := func() Channel { return &always{f: Failure{Class: DeadChannel, Reason: "gone"}} }
				sendFor(time.Minute, Sending{Outbox: m, Routes: withFallback(dead(), ops, time.Hour)})
				m.before = nil
				sendFor(time.Hour, Sending{Outbox: m, Routes: withFallback(dead(), ops, time.Hour)})
				equal(t, fmt.Sprintf("at %d, %v: states", at, applied), m.states(), "sent sent sent sent")
				if n := len(ops.arrived); n < 4 || n > 5 {
					t.Errorf("at %d, %v: %d arrivals", at, applied, n)
				}
			})
		}
	}
}

// When the fallback is taken out of the configuration, what it had not sent goes back.
func TestFallbackGone(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, desk := &memory{}, newChat()
		m.fill("gone", 2)
		m.rows[0].For, m.rows[0].State = "desk", rules.NoticeSending
		_, events := sendFor(time.Hour, Sending{Outbox: m, Routes: one(desk)})
		equal(t, "states", m.states(), "sent failed")
		equal(t, "posts", desk.posts, []string{"n1 (possible repeat)@0"})
		equal(t, "told", len(events), 2)
	})
}

// Notices of one step are marked when the fallback is told of the same flags itself.
func TestTellerMarksWhatTheFallbackIsTold(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk", Fallback: "ops"}, {Name: "ops", Kinds: []rules.Kind{rules.KindBreach}}, {Name: "alone"}}}
	limit := limitOf("birch", 13)
	told := map[string]string{}
	for _, n := range teller.Notices(newsOf(breachOf("alder", 12), limit)) {
		told[n.Channel+fmt.Sprint(n.Refs)] = n.Told
	}
	equal(t, "told", told, map[string]string{"desk[12]": "ops", "desk[13]": "", "ops[12]": "", "alone[12]": "", "alone[13]": ""})
}

// An outbox that fails while notices move: nothing is lost, and the move goes on later.
func TestFallbackWithATroubledOutbox(t *testing.T) {
	bubble(t, func(t *testing.T) {
		m, ops := &memory{}, newChat()
		m.fill("desk", 3)
		fails := 5
		m.before = func(n rules.Notice) error {
			if n.For != "" && fails > 0 {
				fails--
				return errors.New("disk full")
			}
			return nil
		}
		sendFor(time.Hour, Sending{Outbox: m, Routes: withFallback(&always{f: Failure{Class: DeadChannel}}, ops, time.Hour)})
		equal(t, "states", m.states(), "sent sent sent")
		equal(t, "arrived", len(ops.arrived), 3)
	})
}
