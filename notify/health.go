package notify

import (
	"fmt"
	"time"

	"strayd/rules"
)

// State is what a channel's worker is at.
type State string

const (
	Idle    State = "idle"    // nothing to send
	Sends   State = "sending" // a call in hand
	Waiting State = "waiting" // for its pace, or to try again
	Held    State = "held"    // until the channel's hours begin
	Stopped State = "stopped" // until the next start or reload
)

// Health is how a channel does.
type Health struct {
	Channel string
	State   State
	Waiting int           // notices to be sent
	Failed  int           // notices that failed for good
	Oldest  time.Time     // when the oldest waiting notice was made; zero when none waits
	Overdue time.Duration // how long it has waited beyond what the channel's hours ask
	Class   Class         // of the last attempt, or why the channel stopped; "" after a success
	Reason  string
	Sent    time.Time // when a notice was last sent since the start

	Fallback string // the channel that has taken over, "" for none
}

// Health is how each channel does, in the order of the routes.
func (s *Sender) Health() ([]Health, error) {
	var out []Health
	for _, w := range s.workers {
		h, err := w.health()
		if err != nil {
			return nil, err
		}
		out = append(out, h)
	}
	return out, nil
}

func (w *worker) health() (h Health, err error) {
	h.Channel = w.Name
	if h.Waiting, h.Failed, h.Oldest, err = w.s.Outbox.Depth(w.Name); err != nil {
		return h, err
	}
	if h.Waiting > 0 {
		h.Overdue = max(0, now().Sub(w.Hours.Opening(h.Oldest)))
	}
	w.mu.Lock()
	defer w.mu.Unlock()
	h.State, h.Class, h.Reason, h.Sent = w.state, w.class, w.reason, w.sent
	if w.dead || w.fallen {
		h.Fallback = w.Fallback
	}
	if w.fallen && !w.dead {
		h.Overdue = max(h.Overdue, now().Sub(later(w.sent, w.began)))
	}
	return h, nil
}

// overdueTold is how long notices may wait before the daily line names their channel.
const overdueTold = 15 * time.Minute

// Troubles names the channels that do not deliver, with the reason, as the daily line tells them.
func Troubles(channels []Health) []string {
	var out []string
	for _, h := range channels {
		if h.State != Stopped && h.Overdue <= overdueTold && h.Fallback == "" {
			continue
		}
		s := h.Channel + ": " + or(h.Reason, "behind")
		if h.Waiting > 0 {
			s += fmt.Sprintf(" (%d waiting)", h.Waiting)
		}
		if h.Fallback != "" {
			s += ", " + h.Fallback + " stands in"
		}
		out = append(out, s)
	}
	return out
}

// State is what the worker is at.
func (w *worker) State() State {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.state
}

func (w *worker) setState(s State) {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.state = s
}

func (w *worker) note(s State, c Class, reason string) {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.state, w.class, w.reason = s, c, reason
}

// outcome keeps how the last attempt went.
func (w *worker) outcome(n *rules.Notice, c Class) {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.class, w.reason = c, n.Error
	if n.State == rules.NoticeSent {
		w.sent, w.fallen = n.Ended, false
	}
}
