package schedule

import (
	"context"
	"log/slog"
	"time"
)

// now is the wall clock alone. A time that carries a monotonic reading is compared by that, which does not see a clock that is
// set and stands still while the machine sleeps.
func (l *Loop) now() time.Time {
	if l.Now == nil {
		return time.Now().Round(0)
	}
	return l.Now().Round(0)
}

// look reads the clocks, and notes a step when one went further than the other since the last look. A machine that slept looks
// like a step forward. Slots in a future that the clock has left again are owed anew, except those that ran.
func (l *Loop) look() time.Time {
	now, mono := l.now(), time.Now()
	var step time.Duration
	if !l.wall.IsZero() {
		step = now.Sub(l.wall) - mono.Sub(l.mono)
	}
	l.wall, l.mono = now, mono
	switch owed := l.owe(now); {
	case owed || step < -jump:
		l.stepped("the clock went back: slots that ran do not run again", now, step)
	case step > jump:
		l.stepped("the clock went forward, or the machine slept", now, step)
	}
	return now
}

// owe makes the slots after now owed again, and says whether there was a job that was done with some of them.
func (l *Loop) owe(now time.Time) (owed bool) {
	l.mu.Lock()
	defer l.mu.Unlock()
	for _, s := range l.jobs {
		if s.upto.Sub(now) > jump {
			s.done(now)
			owed = true
		}
	}
	return owed
}

func (l *Loop) stepped(how string, now time.Time, step time.Duration) {
	l.mu.Lock()
	l.steps++
	l.mu.Unlock()
	l.log().Warn(how, "now", now, "step", step)
}

// sleep waits until the next slot, a nudge or the end, but never long.
func (l *Loop) sleep(ctx context.Context, now time.Time) {
	timer := time.NewTimer(l.pause(now))
	defer timer.Stop()
	select {
	case <-ctx.Done():
	case <-l.wake:
	case <-timer.C:
	}
}

func (l *Loop) pause(now time.Time) time.Duration {
	l.mu.Lock()
	defer l.mu.Unlock()
	d := longestSleep
	for _, s := range l.jobs {
		if next := s.next(); !next.IsZero() {
			d = min(d, next.Sub(now))
		}
	}
	return d
}

// nudge wakes the loop if it sleeps.
func (l *Loop) nudge() {
	select {
	case l.wake <- struct{}{}:
	default:
	}
}

func (l *Loop) beat() {
	if l.Beat != nil {
		l.Beat()
	}
}

func (l *Loop) log() *slog.Logger {
	if l.Log == nil {
		return slog.New(slog.DiscardHandler)
	}
	return l.Log
}
