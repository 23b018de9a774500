package schedule

import (
	"context"
	"fmt"
	"math/rand/v2"
	"testing"
	"time"
)

// June 2026 in New York, by the calendar: it begins on a Monday, has 22 days from Monday to Friday and 5 Mondays. The program is
// down from Tuesday 9, 18:05 to Thursday 11, 18:05; the clock goes three hours ahead on Monday 15 from 16:00 to 16:35; the pass of
// Wednesday 17, 18:00 takes 35 minutes, that of Friday 19, 17:00 panics; somebody asks for one on Saturday 20.
func TestMonth(t *testing.T) {
	ny := zone(t, "America/New_York")
	in(t, "2026-06-01T00:00:00-04:00", func(d *desk) {
		jobs := []Job{
			d.job("pass", parse(t, "*/10 17-20 * * mon-fri", ny), func(_ context.Context, slot time.Time) error {
				switch slot.Format("02 15:04") {
				case "17 18:00":
					time.Sleep(35 * time.Minute)
				case "19 17:00":
					panic("index out of range")
				}
				return nil
			}),
			d.job("day", parse(t, "30 21 * * mon-fri", ny), nil),
			d.job("week", parse(t, "0 7 * * mon", ny), nil),
		}
		until := func(day, hour, minute int) {
			after(time.Until(time.Date(2026, 6, day, hour, minute, 0, 0, ny)))
		}
		d.start(jobs...)
		until(9, 18, 5)
		d.figures("pass", 6*24+7, 0, 0, 0, 0)
		d.figures("day", 6, 0, 0, 0, 0)
		d.end()
		until(11, 18, 5)
		d.start(jobs...)
		until(15, 16, 0)
		d.set(3 * time.Hour)
		until(15, 16, 35)
		d.set(-3 * time.Hour)
		until(20, 12, 0)
		if _, err := d.loop.Kick("pass"); err != nil {
			t.Error(err)
		}
		until(31, 0, 0) // the end of the 30th
		d.end()

		// One run for the 17 slots of Tuesday, the 24 of Wednesday and the 7 of Thursday while down. The 12 slots from 17:00 to 18:50
		// that passed when the clock went ahead ran after it was put right; those from 19:00 to 19:30 that ran did not again. One
		// run at 18:35 for 18:10, 18:20 and 18:30.
		d.figures("pass", 22*24+1-47-2-(6*24+7), 1, 1, 47+12+2, 0)
		d.figures("day", 22-6-1, 0, 0, 1, 0)
		d.figures("week", 3, 0, 0, 0, 0)
		d.steps(2)
		seen := map[string]int{}
		for _, r := range d.runs {
			seen[r.job]++
			seen[r.job+r.slot.String()]++
			if seen[r.job+r.slot.String()] > 1 {
				t.Errorf("%s ran slot %s again", r.job, r.slot)
			}
		}
		if seen["pass"] != 480 || seen["day"] != 21 || seen["week"] != 5 {
			t.Errorf("%d passes, %d days, %d weeks", seen["pass"], seen["day"], seen["week"])
		}
	})
}

// Whatever happens while the clock runs forward, every slot has a run of its own or is counted as missed, and none runs twice.
func TestEverySlotIsRunOrMissed(t *testing.T) {
	for seed := range uint64(60) {
		r := rand.New(rand.NewPCG(seed, 1))
		in(t, "2026-03-06T00:00:30Z", func(d *desk) {
			jobs := d.trouble(r)
			begin := d.now()
			done := map[string]int{}
			for range 5 {
				d.start(jobs...)
				for range r.IntN(4) {
					after(time.Duration(r.IntN(600)) * time.Minute)
					d.set(time.Duration(r.IntN(300)) * time.Minute)
				}
				after(time.Duration(r.IntN(3600)) * time.Second)
				d.end()
				for _, s := range d.loop.Status() {
					done[s.Job] += s.Runs + s.Missed
					if s.Outcome == Interrupted {
						done[s.Job]--
					}
				}
				after(time.Duration(r.IntN(2000)) * time.Minute)
			}
			for _, j := range jobs {
				last, _ := d.book.LastSlot(j.Name)
				if want := slotsBetween(j.When, begin, last); done[j.Name] != want {
					t.Errorf("seed %d: %s %q ran or missed %d slots of %d up to %s", seed, j.Name, j.When, done[j.Name], want, last)
				}
			}
			d.checkNewest(seed, jobs)
		})
	}
}

// trouble is a few jobs that take their time, fail, panic, or mind the context or not.
func (d *desk) trouble(r *rand.Rand) (jobs []Job) {
	specs := []string{"*/10 17-20 * * *", "0 * * * *", "30 2 * * *", "*/15 * * * *", "@every 40m"}
	for i := range 1 + r.IntN(3) {
		z := zone(d.t, zones[r.IntN(len(zones))])
		dice := rand.New(rand.NewPCG(r.Uint64(), 2))
		jobs = append(jobs, d.job(fmt.Sprint("j", i), parse(d.t, specs[r.IntN(len(specs))], z), func(ctx context.Context, _ time.Time) error {
			wait := time.Duration(dice.IntN(40)*dice.IntN(40)) * time.Second
			switch dice.IntN(6) {
			case 0:
				panic("index out of range")
			case 1:
				return errTest
			case 2:
				time.Sleep(wait)
				return nil
			}
			select {
			case <-time.After(wait):
				return nil
			case <-ctx.Done():
				return ctx.Err()
			}
		}))
	}
	return jobs
}

// slotsBetween counts the slots after one time up to another.
func slotsBetween(s Schedule, after, upto time.Time) (n int) {
	for at := s.Next(after); !at.After(upto); at = s.Next(at) {
		n++
	}
	return n
}

// checkNewest holds each run against the newest slot at its beginning; a slot comes twice only when the first run of it was cut short.
func (d *desk) checkNewest(seed uint64, jobs []Job) {
	d.t.Helper()
	last := map[string]time.Time{}
	for _, r := range d.runs {
		var when Schedule
		for _, j := range jobs {
			if j.Name == r.job {
				when = j.When
			}
		}
		runs := when.Upcoming(r.slot, 1)
		if r.slot.After(r.begun) || !runs[0].After(r.begun) {
			d.t.Errorf("seed %d: %s began slot %s at %s, when %s had passed", seed, r.job, r.slot, r.begun, runs[0])
		}
		if r.slot.Before(last[r.job]) {
			d.t.Errorf("seed %d: %s ran slot %s after %s", seed, r.job, r.slot, last[r.job])
		}
		last[r.job] = r.slot
	}
}

// Whatever the clock does, no slot runs twice while the program is up, and once it stays right every slot that has not run runs.
func TestClockGoesAnywhere(t *testing.T) {
	for seed := range uint64(60) {
		r := rand.New(rand.NewPCG(seed, 3))
		in(t, "2026-03-06T00:00:30Z", func(d *desk) {
			when := parse(t, "*/20 * * * *", nil)
			d.start(d.job("a", when, nil))
			for range 1 + r.IntN(8) {
				after(time.Duration(r.IntN(300)) * time.Minute)
				d.set(time.Duration(r.NormFloat64() * float64(10*time.Hour)))
			}
			after(longestSleep)
			d.set(-time.Duration(d.offset.Load()))
			after(time.Hour + time.Minute)
			begin := d.now()
			after(5 * time.Hour)
			d.end()
			ran := map[int64]bool{}
			for _, run := range d.runs {
				if ran[run.slot.Unix()] {
					t.Errorf("seed %d: slot %s ran again at %s", seed, run.slot, run.begun)
				}
				ran[run.slot.Unix()] = true
			}
			for _, slot := range when.Upcoming(begin, 15) {
				if !ran[slot.Unix()] {
					t.Errorf("seed %d: slot %s did not run", seed, slot)
				}
			}
		})
	}
}
