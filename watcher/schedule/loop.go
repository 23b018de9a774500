package schedule

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"sync"
	"time"
)

const (
	// longestSleep bounds each wait, because a timer does not see a clock that is set, nor a machine that sleeps.
	longestSleep = 30 * time.Second
	// jump is how far the clock may move by itself before it is logged and counted as a step.
	jump = time.Hour
)

// Job is work that runs at the slots of a schedule. Run is handed the slot, never the time of day at which it happens to run; a
// run that was asked for is handed the second at which it begins. The function that is the loop's Beat should be called by a
// long run too, as it advances: then a watchdog stays quiet while it does, and barks when it hangs.
type Job struct {
	Name string
	When Schedule
	Run  func(ctx context.Context, slot time.Time) error
}

// Slots remembers over restarts up to where the slots of each job are done.
type Slots interface {
	// LastSlot is what Done was told last, the zero time for a job that it was never told of.
	LastSlot(job string) (time.Time, error)
	// Done replaces what is remembered, even by an earlier time, which happens after a clock was put right. It is also told
	// when a job is first seen: slots before that are not owed.
	Done(job string, slot time.Time) error
}

// Loop runs jobs at their slots, one run at a time over all jobs. Set the fields before Run and leave them alone.
type Loop struct {
	Jobs     []Job // at the start; Swap changes them
	Slots    Slots
	Now      func() time.Time            // the wall clock; time.Now when nil
	Log      *slog.Logger                // nothing is logged when nil
	Panicked func(job string, value any) // told of each panic of a run; may be nil
	Beat     func()                      // called at each wake and after each run; may be nil

	swap  sync.Mutex // held while jobs change, which may take as long as the slots take to read
	mu    sync.Mutex
	on    bool
	jobs  []*state // changed under both locks
	steps int
	wake  chan struct{}

	wall, mono time.Time // of the last look at the clocks; only the loop's goroutine uses them
}

// Run runs the jobs until the context ends, waits for the run in progress, whose context ends with it, and returns nil. It
// returns an error at once when two jobs share a name or the slots cannot be read. Call it once.
func (l *Loop) Run(ctx context.Context) error {
	if err := l.start(); err != nil {
		return err
	}
	defer l.finish()
	for ctx.Err() == nil {
		now := l.look()
		l.beat()
		if t, ok := l.turn(now); ok {
			l.take(ctx, t)
		} else {
			l.sleep(ctx, now)
		}
	}
	return nil
}

// Swap replaces the jobs, also while one of them runs; that run goes on to its end. Jobs that keep their name keep their slots
// and figures. On an error the old jobs stay.
func (l *Loop) Swap(jobs []Job) error {
	l.swap.Lock()
	defer l.swap.Unlock()
	if !l.running() {
		return errNotRunning
	}
	fresh, err := l.enrol(jobs)
	if err != nil {
		return err
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	old := l.jobs
	l.seat(jobs, fresh)
	for _, s := range old {
		if find(l.jobs, s.Name) == nil {
			s.answer(fmt.Errorf("job %q was taken out of the schedule", s.Name))
		}
	}
	l.nudge()
	return nil
}

var errNotRunning = errors.New("the schedule is not running")

func (l *Loop) running() bool {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.on
}

// Kick asks for a run of a job now, or after the run in progress. While one is waiting, whatever asks for another gets the same.
func (l *Loop) Kick(job string) (*Asked, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	s := find(l.jobs, job)
	switch {
	case !l.on:
		return nil, errNotRunning
	case s == nil:
		return nil, fmt.Errorf("no job %q in the schedule", job)
	case s.asked != nil:
		s.coalesced++
	default:
		s.asked = &Asked{at: l.now(), done: make(chan struct{})}
		l.nudge()
	}
	return s.asked, nil
}

// Asked is a run that was asked for.
type Asked struct {
	at   time.Time
	done chan struct{}
	err  error
}

// Done is closed when the run has ended, or will never begin.
func (a *Asked) Done() <-chan struct{} { return a.done }

// Err is how the run ended. Call it once Done is closed.
func (a *Asked) Err() error { return a.err }

func (l *Loop) start() error {
	l.swap.Lock()
	defer l.swap.Unlock()
	fresh, err := l.enrol(l.Jobs)
	if err != nil {
		return err
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	l.seat(l.Jobs, fresh)
	l.on, l.wake = true, make(chan struct{}, 1)
	return nil
}

// enrol makes the states of the jobs that are not held yet. They begin where the slots say, or now.
func (l *Loop) enrol(jobs []Job) (fresh []*state, err error) {
	for i, j := range jobs {
		for _, other := range jobs[:i] {
			if other.Name == j.Name {
				return nil, fmt.Errorf("two jobs are named %q", j.Name)
			}
		}
	}
	for _, j := range jobs {
		if find(l.jobs, j.Name) != nil {
			continue
		}
		s, err := l.recall(j)
		if err != nil {
			return nil, fmt.Errorf("slots of job %q: %w", j.Name, err)
		}
		fresh = append(fresh, s)
	}
	return fresh, nil
}

// seat makes the states of the jobs, held or fresh, those of the loop.
func (l *Loop) seat(jobs []Job, fresh []*state) {
	next := make([]*state, len(jobs))
	for i, j := range jobs {
		s := find(l.jobs, j.Name)
		if s == nil {
			s = find(fresh, j.Name)
		}
		s.Job, s.ahead = j, time.Time{}
		next[i] = s
	}
	l.jobs = next
}

func (l *Loop) recall(j Job) (*state, error) {
	last, err := l.Slots.LastSlot(j.Name)
	if err != nil {
		return nil, err
	}
	if !last.IsZero() {
		return &state{Job: j, upto: last, ran: []int64{last.Unix()}}, nil
	}
	now := l.now()
	return &state{Job: j, upto: now}, l.Slots.Done(j.Name, now)
}

func (l *Loop) finish() {
	l.mu.Lock()
	defer l.mu.Unlock()
	l.on = false
	for _, s := range l.jobs {
		s.answer(errors.New("the schedule was stopped"))
	}
}

func find(jobs []*state, name string) *state {
	for _, s := range jobs {
		if s.Name == name {
			return s
		}
	}
	return nil
}
