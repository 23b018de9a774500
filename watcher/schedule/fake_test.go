package schedule

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"
)

// book is a Slots in memory that outlives loops, as a ledger outlives processes.
type book struct {
	mu     sync.Mutex
	last   map[string]time.Time
	broken error
}

func (b *book) LastSlot(job string) (time.Time, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	return b.last[job], b.broken
}

func (b *book) Done(job string, slot time.Time) error {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.last == nil {
		b.last = map[string]time.Time{}
	}
	b.last[job] = slot
	return b.broken
}

// run is one call of a job's Run.
type run struct {
	job         string
	slot, begun time.Time
}

// desk is what a test sees of a process: a loop, its runs, and a wall clock that can be set.
type desk struct {
	t      *testing.T
	book   *book
	loop   *Loop
	offset atomic.Int64 // of the wall clock from the bubble's
	active atomic.Int64
	stop   context.CancelFunc
	ended  chan error

	panicked func(job string, value any) // handed to the loops that start
	beat     func()

	mu   sync.Mutex
	runs []run
}

// in runs a test in a bubble whose clock stands at a time after 2000-01-01.
func in(t *testing.T, start string, f func(d *desk)) {
	t.Helper()
	synctest.Test(t, func(t *testing.T) {
		at := moment(t, start)
		time.Sleep(time.Until(at))
		f(&desk{t: t, book: &book{}})
	})
}

func moment(t testing.TB, text string) time.Time {
	t.Helper()
	at, err := time.Parse(time.RFC3339, text)
	if err != nil {
		t.Fatal(err)
	}
	return at
}

func (d *desk) now() time.Time { return time.Now().Add(time.Duration(d.offset.Load())) }

// job is one whose runs are recorded before do is called.
func (d *desk) job(name string, when Schedule, do func(ctx context.Context, slot time.Time) error) Job {
	return Job{Name: name, When: when, Run: func(ctx context.Context, slot time.Time) error {
		if n := d.active.Add(1); n != 1 {
			d.t.Errorf("%d runs at the same time", n)
		}
		defer d.active.Add(-1)
		d.mu.Lock()
		d.runs = append(d.runs, run{name, slot, d.now().Round(0)})
		d.mu.Unlock()
		if do == nil {
			return nil
		}
		return do(ctx, slot)
	}}
}

// start starts a new loop over the book, as a new process would.
func (d *desk) start(jobs ...Job) {
	ctx, cancel := context.WithCancel(d.t.Context())
	d.loop = &Loop{Jobs: jobs, Slots: d.book, Now: d.now, Panicked: d.panicked, Beat: d.beat}
	d.stop, d.ended = cancel, make(chan error, 1)
	go func() { d.ended <- d.loop.Run(ctx) }()
	synctest.Wait()
}

func (d *desk) end() {
	d.t.Helper()
	d.stop()
	if err := <-d.ended; err != nil {
		d.t.Errorf("Run: %v", err)
	}
}

// slots lists the slots that ran since the last call, and forgets them.
func (d *desk) slots() (slots []string) {
	d.mu.Lock()
	defer d.mu.Unlock()
	for _, r := range d.runs {
		slots = append(slots, r.job+" "+r.slot.Format("Mon 02 15:04:05"))
	}
	d.runs = nil
	return slots
}

func (d *desk) check(what string, want ...string) {
	d.t.Helper()
	if got := d.slots(); fmt.Sprintf("%q", got) != fmt.Sprintf("%q", want) {
		d.t.Errorf("%s: ran %q, want %q", what, got, want)
	}
}

// figures checks runs, failed, panics, missed and coalesced of a job.
func (d *desk) figures(job string, want ...int) {
	d.t.Helper()
	s := d.status(job)
	if got := []int{s.Runs, s.Failed, s.Panics, s.Missed, s.Coalesced}; fmt.Sprint(got) != fmt.Sprint(want) {
		d.t.Errorf("%s: runs, failed, panics, missed, coalesced are %v, want %v", job, got, want)
	}
}

func (d *desk) status(job string) Status {
	d.t.Helper()
	for _, s := range d.loop.Status() {
		if s.Job == job {
			return s
		}
	}
	d.t.Fatalf("no status of %s", job)
	return Status{}
}

// after waits and lets what is then due begin.
func after(d time.Duration) {
	time.Sleep(d)
	synctest.Wait()
}

func lasting(d time.Duration) func(context.Context, time.Time) error {
	return func(context.Context, time.Time) error { time.Sleep(d); return nil }
}

var errTest = errors.New("no such folder")
