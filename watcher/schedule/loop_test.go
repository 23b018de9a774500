package schedule

import (
	"context"
	"errors"
	"strings"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"
)

// 2 January 2000 is a Sunday, and 2000 has 52 whole weeks from it and 260 days from Monday to Friday in all (a printed calendar).
func TestYearOfEveningsInNewYork(t *testing.T) {
	ny := zone(t, "America/New_York")
	in(t, "2000-01-01T00:00:00-05:00", func(d *desk) {
		d.start(d.job("a", parse(t, "*/10 17-20 * * mon-fri", ny), nil))
		time.Sleep(time.Until(time.Date(2001, 1, 1, 0, 0, 0, 0, ny)))
		d.end()
		if len(d.runs) != 260*24 {
			t.Errorf("%d runs, want %d", len(d.runs), 260*24)
		}
		for i, r := range d.runs {
			if !r.begun.Equal(r.slot) {
				t.Fatalf("slot %s began at %s", r.slot, r.begun)
			}
			if i > 0 && !r.slot.After(d.runs[i-1].slot) {
				t.Fatalf("slot %s follows %s", r.slot, d.runs[i-1].slot)
			}
		}
		d.figures("a", 260*24, 0, 0, 0, 0)
		if n := d.loop.Steps(); n != 0 {
			t.Errorf("%d clock steps", n)
		}
	})
}

// 24 slots an evening. Down from Monday 18:05 to Thursday 18:05: the 17 left on Monday, 48, and 7 on Thursday up to 18:00.
func TestDowntimeIsCaughtUpByOneRun(t *testing.T) {
	in(t, "2026-06-01T16:00:00Z", func(d *desk) {
		a := d.job("a", parse(t, "*/10 17-20 * * mon-fri", nil), nil)
		d.start(a)
		after(2*time.Hour + 5*time.Minute)
		d.end()
		d.check("before", "a Mon 01 17:00:00", "a Mon 01 17:10:00", "a Mon 01 17:20:00", "a Mon 01 17:30:00", "a Mon 01 17:40:00",
			"a Mon 01 17:50:00", "a Mon 01 18:00:00")
		time.Sleep(72 * time.Hour)
		d.start(a)
		d.check("at the start", "a Thu 04 18:00:00")
		d.figures("a", 1, 0, 0, 17+48+7-1, 0)
		after(6 * time.Minute)
		d.check("after", "a Thu 04 18:10:00")
		d.end()
	})
}

// Years of downtime are not counted through: a run every 10 minutes has 52,560 slots a year.
func TestLongDowntime(t *testing.T) {
	in(t, "2026-06-01T16:05:00Z", func(d *desk) {
		a := d.job("a", parse(t, "*/10 * * * *", nil), nil)
		d.book.Done("a", moment(t, "2025-06-01T00:00:00Z"))
		d.start(a)
		d.check("at the start", "a Mon 01 16:00:00")
		d.figures("a", 1, 0, 0, mostSlots, 0)
		after(6 * time.Minute)
		d.check("after", "a Mon 01 16:10:00")
		d.end()
	})
}

func TestJobIsNotOwedWhatCameBeforeIt(t *testing.T) {
	in(t, "2026-06-01T16:05:00Z", func(d *desk) {
		a := d.job("a", parse(t, "*/10 * * * *", nil), nil)
		d.start(a)
		d.check("at first sight")
		d.end()
		after(20 * time.Minute)
		d.start(a)
		d.check("after downtime before the first run", "a Mon 01 16:20:00")
		d.figures("a", 1, 0, 0, 1, 0)
		d.end()
	})
}

func TestRunsDoNotOverlap(t *testing.T) {
	in(t, "2026-06-01T11:59:00Z", func(d *desk) {
		d.start(d.job("long", parse(t, "0 * * * *", nil), lasting(25*time.Minute)),
			d.job("short", parse(t, "*/10 * * * *", nil), lasting(time.Minute)))
		after(time.Minute)
		if s := d.status("long"); s.Began.IsZero() || !s.Next.Equal(moment(t, "2026-06-01T12:00:00Z")) {
			t.Errorf("running since %s, next %s", s.Began, s.Next)
		}
		after(time.Hour - time.Minute)
		d.check("an hour", "long Mon 01 12:00:00", "short Mon 01 12:20:00", "short Mon 01 12:30:00", "short Mon 01 12:40:00", "short Mon 01 12:50:00")
		d.figures("short", 4, 0, 0, 2, 0) // 12:00 and 12:10 passed meanwhile
		d.figures("long", 1, 0, 0, 0, 0)
		if s := d.status("long"); !s.Began.IsZero() || s.Outcome != Succeeded || !s.Ended.Equal(moment(t, "2026-06-01T12:25:00Z")) {
			t.Errorf("after the run: %+v", s)
		}
		d.end()
	})
}

// A job that always has something to do leaves the others their turn.
func TestNoJobStarves(t *testing.T) {
	in(t, "2026-06-01T11:59:30Z", func(d *desk) {
		every := parse(t, "* * * * *", nil)
		d.start(d.job("a", every, lasting(90*time.Second)), d.job("b", every, lasting(90*time.Second)))
		after(30*time.Second + time.Hour - time.Second)
		d.end()
		count := map[string]int{}
		for _, r := range d.runs {
			count[r.job]++
		}
		if count["a"] != 20 || count["b"] != 20 {
			t.Errorf("runs: %v, want 20 each", count)
		}
	})
}

func TestFailedRunsAreCountedAndTheNextOneRuns(t *testing.T) {
	in(t, "2026-06-01T11:59:00Z", func(d *desk) {
		var told []any
		d.panicked = func(job string, value any) { told = append(told, job, value) }
		nth := 0
		d.start(d.job("a", parse(t, "0 * * * *", nil), func(context.Context, time.Time) error {
			switch nth++; nth {
			case 1:
				panic("index out of range")
			case 2:
				return errTest
			}
			return nil
		}))
		after(2 * time.Minute)
		if s := d.status("a"); s.Outcome != Panicked || s.Error != "panic: index out of range" {
			t.Errorf("after a panic: %s, %q", s.Outcome, s.Error)
		}
		after(time.Hour)
		if s := d.status("a"); s.Outcome != Failed || s.Error != "no such folder" {
			t.Errorf("after an error: %s, %q", s.Outcome, s.Error)
		}
		after(time.Hour)
		if s := d.status("a"); s.Outcome != Succeeded || s.Error != "" {
			t.Errorf("after a success: %s, %q", s.Outcome, s.Error)
		}
		d.check("each slot once", "a Mon 01 12:00:00", "a Mon 01 13:00:00", "a Mon 01 14:00:00")
		d.figures("a", 3, 2, 1, 0, 0)
		if len(told) != 2 || told[0] != "a" || told[1] != "index out of range" {
			t.Errorf("told of the panic: %v", told)
		}
		d.end()
	})
}

func TestKick(t *testing.T) {
	in(t, "2026-06-01T12:10:05Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), lasting(30*time.Minute)))
		first, err := d.loop.Kick("a")
		if err != nil {
			t.Fatal(err)
		}
		synctest.Wait()
		d.check("at once", "a Mon 01 12:10:05")
		second, _ := d.loop.Kick("a") // one waits behind the run in progress
		third, _ := d.loop.Kick("a")
		if second == first || third != second || !d.status("a").Waiting {
			t.Error("a run asked for during a run waits, and takes further ones in")
		}
		<-first.Done()
		synctest.Wait()
		d.check("then the one that waited", "a Mon 01 12:40:05")
		fourth, _ := d.loop.Kick("a")
		<-third.Done()
		synctest.Wait()
		d.check("a slot that is due serves who asked", "a Mon 01 13:00:00")
		<-fourth.Done()
		if first.Err() != nil || third.Err() != nil || fourth.Err() != nil {
			t.Error(first.Err(), third.Err(), fourth.Err())
		}
		after(time.Minute)
		d.check("no more")
		d.figures("a", 3, 0, 0, 0, 2)
		if _, err := d.loop.Kick("b"); err == nil || err.Error() != `no job "b" in the schedule` {
			t.Errorf("unknown job: %v", err)
		}
		d.end()
		if _, err := d.loop.Kick("a"); err == nil || err.Error() != "the schedule is not running" {
			t.Errorf("after the end: %v", err)
		}
	})
}

// A kick is no slot: after a restart, the slots are what they were.
func TestKickLeavesSlotsAlone(t *testing.T) {
	in(t, "2026-06-01T12:10:05Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), func(context.Context, time.Time) error { return errTest }))
		asked, _ := d.loop.Kick("a")
		<-asked.Done()
		if asked.Err() != errTest {
			t.Errorf("asked run ended with %v", asked.Err())
		}
		if last, _ := d.book.LastSlot("a"); !last.Equal(moment(t, "2026-06-01T12:10:05Z")) {
			t.Errorf("last slot is %s", last) // when it was first seen
		}
		d.end()
	})
}

func TestStop(t *testing.T) {
	in(t, "2026-06-01T11:59:00Z", func(d *desk) {
		pass := func(ctx context.Context, _ time.Time) error {
			<-ctx.Done()
			time.Sleep(4 * time.Second) // winds up
			return ctx.Err()
		}
		d.start(d.job("a", parse(t, "0 * * * *", nil), pass), d.job("b", parse(t, "0 * * * *", nil), nil))
		after(10 * time.Minute)
		asked, _ := d.loop.Kick("b")
		begin := time.Now()
		d.end()
		if took := time.Since(begin); took != 4*time.Second {
			t.Errorf("stopped in %s, want when the run ended", took)
		}
		<-asked.Done()
		if asked.Err() == nil || asked.Err().Error() != "the schedule was stopped" {
			t.Errorf("run asked for and never begun: %v", asked.Err())
		}
		d.check("no new run", "a Mon 01 12:00:00")
		d.figures("a", 1, 0, 0, 0, 0)
		if s := d.status("a"); s.Outcome != Interrupted {
			t.Errorf("outcome %s", s.Outcome)
		}
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil), d.job("b", parse(t, "0 * * * *", nil), nil))
		d.check("the cut one and the one not begun are caught up", "a Mon 01 12:00:00", "b Mon 01 12:00:00")
		d.end()
	})
}

// A run that comes to its end although the loop ends has done its slot.
func TestStopDuringARunThatSucceeds(t *testing.T) {
	in(t, "2026-06-01T11:59:00Z", func(d *desk) {
		a := d.job("a", parse(t, "0 * * * *", nil), lasting(10*time.Minute))
		d.start(a)
		after(2 * time.Minute)
		d.end()
		if s := d.status("a"); s.Outcome != Succeeded || s.Error != "" {
			t.Errorf("outcome %s, %q", s.Outcome, s.Error)
		}
		d.start(a)
		after(time.Minute)
		d.end()
		d.check("not again", "a Mon 01 12:00:00")
	})
}

func TestStopWithoutRunIsAtOnce(t *testing.T) {
	in(t, "2026-06-01T11:59:00Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil))
		begin := time.Now()
		d.end()
		if took := time.Since(begin); took != 0 {
			t.Errorf("stopped in %s", took)
		}
	})
}

func TestSwapWhileWaiting(t *testing.T) {
	in(t, "2026-06-01T12:05:00Z", func(d *desk) {
		hourly, often := parse(t, "0 * * * *", nil), parse(t, "*/10 * * * *", nil)
		a, b := d.job("a", hourly, nil), d.job("b", hourly, nil)
		d.start(a, b)
		after(time.Hour)
		d.check("before", "a Mon 01 13:00:00", "b Mon 01 13:00:00")
		swap(t, d, d.job("a", often, nil), d.job("c", often, nil))
		synctest.Wait()
		d.check("a new job owes nothing, a held one is done up to 13:00")
		d.figures("a", 1, 0, 0, 0, 0)
		after(5 * time.Minute)
		d.check("the new schedules hold", "a Mon 01 13:10:00", "c Mon 01 13:10:00")
		swap(t, d, d.job("b", hourly, nil))
		after(50 * time.Minute)
		d.check("a job that comes back goes on from its last slot", "b Mon 01 14:00:00")
		d.end()
	})
}

// A new job does not wait until the loop wakes by itself.
func TestSwapWakes(t *testing.T) {
	in(t, "2026-06-01T12:59:35Z", func(d *desk) {
		d.start()
		after(10 * time.Second)
		swap(t, d, d.job("a", parse(t, "0 * * * *", nil), nil))
		after(time.Minute)
		if begun := d.runs[0].begun; !begun.Equal(moment(t, "2026-06-01T13:00:00Z")) {
			t.Errorf("began at %s", begun)
		}
		d.end()
	})
}

func swap(t *testing.T, d *desk, jobs ...Job) {
	t.Helper()
	if err := d.loop.Swap(jobs); err != nil {
		t.Fatal(err)
	}
}

func TestSwapWhileRunning(t *testing.T) {
	in(t, "2026-06-01T12:55:00Z", func(d *desk) {
		hourly := parse(t, "0 * * * *", nil)
		a := d.job("a", hourly, lasting(10*time.Minute))
		d.start(a, d.job("b", hourly, nil))
		after(6 * time.Minute)
		asked, _ := d.loop.Kick("b")
		swap(t, d, d.job("a", parse(t, "5 * * * *", nil), nil))
		<-asked.Done()
		if asked.Err() == nil || asked.Err().Error() != `job "b" was taken out of the schedule` {
			t.Errorf("asked run of a job taken out: %v", asked.Err())
		}
		after(10 * time.Minute)
		d.check("the run goes on, then the new schedule", "a Mon 01 13:00:00", "a Mon 01 13:05:00")
		d.figures("a", 2, 0, 0, 0, 0)
		swap(t, d, a)
		after(43 * time.Minute)
		swap(t, d) // out while it waits
		after(10 * time.Minute)
		d.check("nothing is left")
		d.end()
	})
}

func TestSwapKeepsTheOldJobsOnAnError(t *testing.T) {
	in(t, "2026-06-01T12:05:00Z", func(d *desk) {
		hourly := parse(t, "0 * * * *", nil)
		a := d.job("a", hourly, nil)
		d.start(a)
		if err := d.loop.Swap([]Job{d.job("b", hourly, nil), d.job("b", hourly, nil)}); err == nil || err.Error() != `two jobs are named "b"` {
			t.Errorf("two of a name: %v", err)
		}
		d.book.broken = errTest
		if err := d.loop.Swap([]Job{d.job("a", hourly, lasting(time.Hour)), d.job("c", hourly, nil)}); !errors.Is(err, errTest) {
			t.Errorf("slots cannot be read: %v", err)
		}
		after(2 * time.Hour) // nor written: the runs go on
		d.check("old jobs", "a Mon 01 13:00:00", "a Mon 01 14:00:00")
		d.end()
		if err := d.loop.Swap(nil); err == nil {
			t.Error("swapped after the end")
		}
	})
}

func TestRunRefuses(t *testing.T) {
	check := func(l *Loop, want string) {
		t.Helper()
		if err := l.Run(t.Context()); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("Run: %v, want %s", err, want)
		}
	}
	check(&Loop{Jobs: []Job{{Name: "a"}, {Name: "a"}}, Slots: &book{}}, `two jobs are named "a"`)
	check(&Loop{Jobs: []Job{{Name: "a"}}, Slots: &book{broken: errTest}}, `slots of job "a": no such folder`)
}

// The longest wait between two beats is what a watchdog sees. A run that advances beats by itself, one that hangs does not.
func TestBeats(t *testing.T) {
	in(t, "2026-06-01T12:30:00Z", func(d *desk) {
		var last, worst atomic.Int64
		last.Store(time.Now().Unix())
		d.beat = func() {
			now := time.Now().Unix()
			worst.Store(max(worst.Load(), now-last.Swap(now)))
		}
		advancing := func(context.Context, time.Time) error {
			for range 60 {
				time.Sleep(10 * time.Second)
				d.beat()
			}
			return nil
		}
		d.start(d.job("a", parse(t, "0 * * * *", nil), advancing), d.job("b", parse(t, "30 * * * *", nil), lasting(10*time.Minute)))
		after(45 * time.Minute)
		if n := worst.Load(); n > 30 {
			t.Errorf("%d s without a beat though all went well", n)
		}
		after(time.Hour)
		if n := worst.Load(); n != 600 {
			t.Errorf("%d s without a beat while a run hung for 600 s", n)
		}
		d.end()
	})
}
