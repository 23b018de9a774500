package schedule

import (
	"slices"
	"time"
)

// mostSlots bounds how many missed slots are counted and how many runs are remembered.
const mostSlots = 400

// state is a job with what became of its slots.
type state struct {
	Job
	upto  time.Time // slots up to here are done with
	ran   []int64   // newest slots that ran, in Unix seconds: they do not run again when the clock goes back
	asked *Asked    // nil when no run is waiting
	ahead time.Time // what next gave last; zero when it must look again

	began, ended                            time.Time
	outcome                                 Outcome
	err                                     error
	runs, missed, failed, panics, coalesced int
}

// turn is one run that is due.
type turn struct {
	job   Job // as it was when its turn came
	state *state
	slot  time.Time // the newest of the slots that are due, or now when none is
	slots int       // how many are due
	asked *Asked    // nil when nobody asked for it
	since time.Time // when the first of them fell due
}

// due is the turn of a job; ok is false when it has nothing to do.
func (s *state) due(now time.Time) (t turn, ok bool) {
	t = turn{job: s.Job, state: s, asked: s.asked}
	t.since, t.slot, t.slots = s.waiting(now)
	if t.slots == 0 {
		t.slot = now.Truncate(time.Second)
	}
	if s.asked != nil {
		t.since = earliest(t.since, s.asked.at)
	}
	return t, t.slots > 0 || s.asked != nil
}

// waiting is the first and the newest of the n slots up to now that are neither done with nor have run. Past mostSlots it counts
// no further and takes the newest.
func (s *state) waiting(now time.Time) (first, newest time.Time, n int) {
	at := s.next()
	for steps := 0; !at.IsZero() && !at.After(now); steps++ {
		far := steps == mostSlots
		if far {
			at = s.When.Latest(now)
		}
		if !s.has(at) {
			first, newest, n = earliest(first, at), at, n+1
		} else if far {
			s.done(at) // it ran before the clock was put wrong and right again: so did all before it
			return time.Time{}, time.Time{}, 0
		}
		if far {
			break
		}
		at = s.When.Next(at)
	}
	return first, newest, n
}

// next is the first slot that has not run; the zero time when there is none.
func (s *state) next() time.Time {
	if s.ahead.IsZero() {
		s.ahead = s.When.Next(s.upto)
		for steps := 0; steps < mostSlots && s.has(s.ahead); steps++ {
			s.ahead = s.When.Next(s.ahead)
		}
	}
	return s.ahead
}

func (s *state) has(slot time.Time) bool { return slices.Contains(s.ran, slot.Unix()) }

// done notes that the slots up to a time are done with, or owed again when it is an earlier one.
func (s *state) done(upto time.Time) { s.upto, s.ahead = upto, time.Time{} }

// mark notes that a slot ran, which is done with those before it too.
func (s *state) mark(slot time.Time) {
	s.done(slot)
	s.ran = append(s.ran, slot.Unix())
	if n := len(s.ran) - mostSlots; n > 0 {
		s.ran = slices.Delete(s.ran, 0, n)
	}
}

// answer tells whoever asked for the waiting run how it ended.
func (s *state) answer(err error) {
	if s.asked != nil {
		s.asked.end(err)
		s.asked = nil
	}
}

func (a *Asked) end(err error) {
	a.err = err
	close(a.done)
}

// earliest is the earlier of two times; a may be the zero time, which counts as none.
func earliest(a, b time.Time) time.Time {
	if a.IsZero() || b.Before(a) {
		return b
	}
	return a
}
