package schedule

import (
	"context"
	"fmt"
	"runtime/debug"
	"time"
)

// Outcome is how a run ended.
type Outcome string

// The outcomes. A job that has not run yet has none.
const (
	Succeeded   Outcome = "done"
	Failed      Outcome = "failed"
	Panicked    Outcome = "panicked"    // also counted as failed
	Interrupted Outcome = "interrupted" // by the end of the loop: its slot is caught up after the next start
)

// turn picks the run whose slot, or asking, has waited longest, and notes that it begins.
func (l *Loop) turn(now time.Time) (turn, bool) {
	l.mu.Lock()
	defer l.mu.Unlock()
	var first turn
	for _, s := range l.jobs {
		if t, ok := s.due(now); ok && (first.state == nil || t.since.Before(first.since)) {
			first = t
		}
	}
	s := first.state
	if s == nil {
		return turn{}, false
	}
	s.began, s.asked = now, nil
	if first.slots > 0 && first.asked != nil {
		s.coalesced++
	}
	return first, true
}

// take makes one run. Its slot is done with however the run ends, so that a job that fails does not spin; only a run that
// the end of the loop cut short leaves its slot to the next start.
func (l *Loop) take(ctx context.Context, t turn) {
	log := l.log().With("job", t.job.Name, "slot", t.slot)
	if late := t.state.began.Sub(t.slot); t.slots > 1 || late > time.Minute {
		log.Warn("slots were missed: one run catches up with them", "slots", t.slots, "late", late)
	}
	outcome, err := l.attempt(ctx, t)
	if outcome == Failed && ctx.Err() != nil {
		outcome = Interrupted
	}
	if outcome != Succeeded {
		log.Error("run did not succeed", "outcome", outcome, "error", err)
	}
	if t.slots > 0 && outcome != Interrupted {
		if err := l.Slots.Done(t.job.Name, t.slot); err != nil {
			log.Error("slot cannot be noted as done", "error", err)
		}
	}
	l.end(t, outcome, err)
}

// attempt runs the job and turns a panic into an error.
func (l *Loop) attempt(ctx context.Context, t turn) (outcome Outcome, err error) {
	defer func() {
		v := recover()
		if v == nil {
			return
		}
		outcome, err = Panicked, fmt.Errorf("panic: %v", v)
		l.log().Error("panic in a run", "job", t.job.Name, "value", v, "stack", string(debug.Stack()))
		if l.Panicked != nil {
			l.Panicked(t.job.Name, v)
		}
	}()
	if err := t.job.Run(ctx, t.slot); err != nil {
		return Failed, err
	}
	return Succeeded, nil
}

func (l *Loop) end(t turn, outcome Outcome, err error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	s := t.state
	s.began, s.ended, s.outcome, s.err = time.Time{}, l.now(), outcome, err
	s.runs++
	if t.slots > 0 && outcome != Interrupted {
		s.mark(t.slot)
		s.missed += t.slots - 1
	}
	switch outcome {
	case Panicked:
		s.panics++
		s.failed++
	case Failed:
		s.failed++
	}
	if t.asked != nil {
		t.asked.end(err)
	}
}
