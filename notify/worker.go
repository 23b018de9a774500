package notify

import (
	"context"
	"fmt"
	"sync"
	"time"

	"strayd/rules"
)

const (
	lookEvery  = time.Minute      // at an outbox that nobody said had changed
	napLongest = 30 * time.Second // so that a machine's sleep or a clock step delays nothing for longer
	storeRetry = 10 * time.Second // after an error of the outbox
)

// worker delivers the notices of one channel.
type worker struct {
	Route
	s    *Sender
	wake chan struct{}

	pictures chan rules.Notice // sent, with a picture to follow

	pause  time.Time // no call before
	plain  uint64    // number of the notice that is to go as bare text
	oddOne uint64    // number of the notice that failed last for an unknown reason,
	odd    int       // and how often it did

	mu     sync.Mutex // guards what Health reads
	state  State
	class  Class
	reason string
	began  time.Time
	sent   time.Time
	dead   bool // for good, until the next start or reload
	fallen bool // its fallback has taken over, and it has delivered nothing since
}

func (w *worker) run(ctx context.Context) {
	w.mu.Lock()
	w.began = now()
	w.mu.Unlock()
	var pictures sync.WaitGroup
	pictures.Go(func() { w.attaching(ctx) })
	defer pictures.Wait()
	defer close(w.pictures)
	for !w.takeUp() {
		if !w.nap(ctx, storeRetry) {
			return
		}
	}
	for ctx.Err() == nil {
		switch {
		case !w.alive() && w.Fallback == "":
			return
		case w.State() == Stopped:
			w.handOver()
			w.nap(ctx, lookEvery)
		default:
			if w.lags() {
				w.handOver()
			}
			w.step(ctx)
		}
	}
}

// takeUp puts the notices whose last attempt has no recorded outcome back into the queue. They may have got through.
func (w *worker) takeUp() bool {
	left, err := w.s.Outbox.Sending(w.Name)
	for _, n := range left {
		n.State, n.Repeat, n.Next = rules.NoticeWaiting, true, now()
		n.Error = "the program stopped during the attempt"
		if err == nil {
			err = w.s.Outbox.Mark(n)
		}
	}
	return w.stored(err)
}

// alive says whether the channel goes on: neither it nor its service is dead.
func (w *worker) alive() bool {
	if reason, dead := w.s.serviceDead(w.Service); dead && w.State() != Stopped {
		w.stop(DeadAll, reason)
	}
	return w.State() != Stopped
}

// stop ends the channel until the next start or reload. Its notices have moved before it is seen to have stopped.
func (w *worker) stop(c Class, reason string) {
	w.mu.Lock()
	w.dead, w.state = true, Sends
	w.mu.Unlock()
	w.handOver()
	w.note(Stopped, c, reason)
}

// step does one thing: waits, or makes one attempt with the notice at the head of the queue.
func (w *worker) step(ctx context.Context) {
	n, ok, err := w.s.Outbox.Next(w.Name)
	switch {
	case !w.stored(err):
		w.nap(ctx, storeRetry)
	case !ok:
		w.setState(Idle)
		w.nap(ctx, lookEvery)
	default:
		if wait := w.due(n).Sub(now()); wait > 0 {
			w.nap(ctx, min(wait, napLongest))
			return
		}
		w.attempt(ctx, n)
	}
}

// due is when the notice may be handed over: its own time, the channel's pace or pause, and the channel's hours.
func (w *worker) due(n rules.Notice) time.Time {
	at := later(later(n.Next, w.pause), now())
	if open := w.Hours.Opening(at); n.Kind != rules.KindTest && open.After(at) {
		w.setState(Held)
		return open
	}
	w.setState(Waiting)
	return at
}

// nap waits until the span is over or somebody wakes the worker. It is false when the worker is to stop.
func (w *worker) nap(ctx context.Context, d time.Duration) bool {
	timer := time.NewTimer(d)
	defer timer.Stop()
	select {
	case <-ctx.Done():
		return false
	case <-w.wake:
	case <-timer.C:
	}
	return ctx.Err() == nil
}

// stored reports an error of the outbox; it is true when there is none.
func (w *worker) stored(err error) bool {
	if err != nil {
		w.s.Report(Event{Channel: w.Name, Class: Unknown, Reason: "outbox: " + err.Error()})
	}
	return err == nil
}

// call hands the notice to the channel. A stop leaves it the grace to finish. A panic is an unknown error of this notice.
func (w *worker) call(ctx context.Context, post func(context.Context, rules.Notice) (string, error), n rules.Notice) (receipt string, err error) {
	inner, cancel := w.grace(ctx)
	defer cancel()
	if p, ok := w.To.(Pacer); ok {
		w.pause = now().Add(p.Pace())
	}
	defer func() {
		if p := recover(); p != nil {
			err = fmt.Errorf("panic: %v", p)
		}
	}()
	n.Lines = worded(n, now(), w.s.Zone)
	return post(inner, n)
}
