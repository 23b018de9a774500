package schedule

import (
	"strings"
	"testing"
	"time"
)

// set moves the wall clock by some time at once: a clock that is set, or a machine that slept meanwhile.
func (d *desk) set(by time.Duration) { d.offset.Add(int64(by)) }

func (d *desk) steps(want int) {
	d.t.Helper()
	if got := d.loop.Steps(); got != want {
		d.t.Errorf("%d clock steps, want %d", got, want)
	}
}

// The machine sleeps from 12:00:10 for three days, inside one wait of the loop: 72 hourly slots pass, 13:00 to 12:00.
func TestSuspend(t *testing.T) {
	in(t, "2026-06-01T11:59:50Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil))
		after(20 * time.Second)
		d.check("before", "a Mon 01 12:00:00")
		d.set(72 * time.Hour)
		after(longestSleep)
		d.check("within one wait", "a Thu 04 12:00:00")
		d.figures("a", 2, 0, 0, 71, 0)
		d.steps(1)
		after(time.Hour)
		d.check("then as ever", "a Thu 04 13:00:00")
		d.end()
	})
}

func TestSuspendDuringARun(t *testing.T) {
	in(t, "2026-06-01T11:59:50Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), lasting(time.Minute)))
		after(20 * time.Second)
		d.set(5 * time.Hour)
		after(time.Minute)
		d.check("once it is over", "a Mon 01 12:00:00", "a Mon 01 17:00:00")
		d.steps(1)
		d.end()
	})
}

func TestClockGoesBack(t *testing.T) {
	in(t, "2026-06-01T12:30:00Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil))
		after(3 * time.Hour)
		d.check("before", "a Mon 01 13:00:00", "a Mon 01 14:00:00", "a Mon 01 15:00:00")
		d.set(-5 * time.Hour) // 15:30 becomes 10:30
		after(2 * time.Hour)
		d.check("slots that never ran", "a Mon 01 11:00:00", "a Mon 01 12:00:00")
		d.steps(1)
		after(3 * time.Hour)
		d.check("slots that ran")
		after(time.Hour)
		d.check("then as ever", "a Mon 01 16:00:00")
		d.figures("a", 6, 0, 0, 0, 0)
		d.steps(1)
		d.end()
	})
}

// A step of an hour or less is neither counted nor owed: the slots it repeats are done with.
func TestClockGoesBackALittle(t *testing.T) {
	in(t, "2026-06-01T12:55:00Z", func(d *desk) {
		d.start(d.job("a", parse(t, "*/30 * * * *", nil), nil))
		after(6 * time.Minute)
		d.check("before", "a Mon 01 13:00:00")
		d.set(-50 * time.Minute)
		after(80 * time.Minute)
		d.check("after", "a Mon 01 13:30:00")
		d.steps(0)
		d.end()
	})
}

// A step is seen although no slot is affected, and a long run is none.
func TestStepsAreOfTheClockOnly(t *testing.T) {
	in(t, "2026-06-01T11:00:00Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 12 * * *", nil), lasting(3*time.Hour)))
		after(6 * time.Hour)
		d.check("a run of three hours", "a Mon 01 12:00:00")
		d.steps(0)
		d.set(-2 * time.Hour)
		after(longestSleep)
		d.steps(1)
		d.set(2 * time.Hour)
		after(longestSleep)
		d.steps(2)
		d.check("no slot passed")
		d.end()
	})
}

// The wall clock alone counts: a reading of the monotonic clock, which time.Time prints as m=, would hide a sleep of the machine.
func TestNowIsTheWallClock(t *testing.T) {
	for _, l := range []*Loop{{}, {Now: time.Now}} {
		if now := l.now().String(); strings.Contains(now, "m=") {
			t.Errorf("now is %s", now)
		}
	}
}

// The clock runs a year ahead for an hour. What ran meanwhile is no reason to be silent for a year.
func TestClockGoesForwardAndBack(t *testing.T) {
	in(t, "2026-06-01T12:30:00Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil))
		d.set(365 * 24 * time.Hour)
		after(time.Hour)
		d.check("a year ahead", "a Tue 01 12:00:00", "a Tue 01 13:00:00")
		d.figures("a", 2, 0, 0, mostSlots, 0) // those before 12:00 are counted no further
		d.set(-365 * 24 * time.Hour)
		after(time.Hour)
		d.check("put right", "a Mon 01 14:00:00")
		d.steps(2)
		d.end()
	})
}

// The clock falls back to 1970, as that of a machine without a battery does, and is put right: nothing runs again, and the slots
// of half a century are not run one by one.
func TestClockFallsToItsBeginningAndBack(t *testing.T) {
	in(t, "2026-06-01T12:30:00Z", func(d *desk) {
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil))
		after(time.Hour)
		fall := time.Since(time.Unix(0, 0))
		d.set(-fall)
		after(90 * time.Minute)
		d.check("before, and in 1970", "a Mon 01 13:00:00", "a Thu 01 01:00:00")
		d.set(fall - 90*time.Minute)
		after(time.Minute)
		d.check("put right: 13:00 ran")
		after(time.Hour)
		d.check("then as ever", "a Mon 01 14:00:00")
		d.steps(2)
		d.end()
	})
}

// The ledger's last slot lies ahead of the clock at the start: one of the two is wrong. That slot does not run again.
func TestStartBeforeTheLastSlot(t *testing.T) {
	in(t, "2026-06-01T12:30:00Z", func(d *desk) {
		d.book.Done("a", moment(t, "2026-06-01T15:00:00Z"))
		d.start(d.job("a", parse(t, "0 * * * *", nil), nil))
		after(4 * time.Hour)
		d.check("hours", "a Mon 01 13:00:00", "a Mon 01 14:00:00", "a Mon 01 16:00:00")
		d.steps(1)
		d.end()
	})
}

func TestLatest(t *testing.T) {
	for _, spec := range []string{"* * * * *", "*/10 17-20 * * mon-fri", "30 2 * * *", "0 7 * * mon", "@monthly", "@every 7h"} {
		for _, name := range zones {
			z := zone(t, name)
			s := parse(t, spec, z)
			for _, change := range changes(z) {
				checkLatest(t, s, change)
			}
			checkLatest(t, s, time.Date(2026, 6, 1, 0, 0, 0, 0, z))
		}
	}
	if got := (Schedule{}).Latest(time.Now()); !got.IsZero() {
		t.Errorf("latest run of the zero schedule: %s", got)
	}
}

// checkLatest holds the newest run at some times against the runs that Upcoming lists.
func checkLatest(t *testing.T, s Schedule, around time.Time) {
	t.Helper()
	runs := s.Upcoming(around.Add(-10*time.Hour), 30)
	for i, run := range runs[1:] {
		for _, at := range []time.Time{runs[i], run.Add(-time.Nanosecond)} {
			if got := s.Latest(at); !got.Equal(runs[i]) {
				t.Fatalf("%s %s: latest run at %s is %s, want %s", s.zone, s, at, got, runs[i])
			}
		}
	}
}
