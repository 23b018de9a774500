package causes

import (
	"math"

	"strayd/rules"
)

// state is what a pool remembers of one series.
type state struct {
	used [slots]float64 // returns as the windows take them, NaN where there is none
	ref  [slots]float64 // the reference's returns, NaN where there is none
	mark [slots]uint8   // what a date was: see markZero
	fit  fit
	own  scale
	rest scale
	grid grid

	zeros, repeats coincidence // within span dates
	seen           int

	printed     rules.Units // of the last date; Missing
	lastPrinted rules.Units // the newest value, however old
	lastAt      int         // its date
	yesterday   float64     // return of the date before, NaN where there is none
	unchanged   int         // dates in a row with the same value, at most 10
	sofar       float64     // one plus the return since the month began

	event int // the first that may still matter

	held    held // a value that waits a date before it enters the windows
	isOut   bool // today's value was concluded to be wrong
	isWrong bool // by its followers
	lately  int  // dates of the last ten on which it was wrong

	chain chain
}

// coincidence counts days on which something happened that may be an error, and the runs of such days.
type coincidence struct{ days, runs int }

func (c *coincidence) count(day, run bool, by int) {
	if day {
		c.days += by
	}
	if run {
		c.runs += by
	}
}

// marks of a date
const (
	markZero = 1 << iota
	markRepeat
	markAgain // the second or later of a run of either
	markSeen
	markOut
)

// held is an extreme value: it enters the windows one date late, so that a spike which the next date takes back never was in them.
type held struct {
	is   bool
	out  bool // it will not enter
	t    int
	look look
}

func newState() state {
	st := state{own: newScale(), rest: newScale(), grid: newGrid(), chain: chain{partner: -1}, yesterday: math.NaN(), sofar: 1,
		printed: rules.Missing, lastPrinted: rules.Missing}
	for i := range st.used {
		st.used[i], st.ref[i] = math.NaN(), math.NaN()
	}
	return st
}

// expire forgets what is too old to matter on date t.
func (st *state) expire(t int) {
	st.own.expire(t)
	st.rest.expire(t)
	st.grid.expire(t)
	st.count(st.mark[(t-span-1)&mask], -1)
	if st.mark[(t-11)&mask]&markOut != 0 {
		st.lately--
	}
	at := t & mask
	st.used[at], st.ref[at], st.mark[at] = math.NaN(), math.NaN(), 0
}

func (st *state) count(mark uint8, by int) {
	if mark&markSeen != 0 {
		st.seen += by
	}
	first := mark&markAgain == 0
	st.zeros.count(mark&markZero != 0, mark&markZero != 0 && first, by)
	st.repeats.count(mark&markRepeat != 0, mark&markRepeat != 0 && first, by)
}

// enter takes a value into the windows of date t.
func (st *state) enter(t int, lk *look) {
	at := t & mask
	bound := st.own.bound()
	st.own.take(t, lk.x, bound, lk.full)
	st.used[at], st.ref[at] = lk.x, lk.m
	if lk.hasRef {
		st.rest.take(t, lk.x-lk.mu, st.rest.bound(), lk.full)
	}
}

// leaveOut notes that the value of date t does not enter.
func (st *state) leaveOut(t int, m float64) {
	st.ref[t&mask] = m
	st.mark[t&mask] |= markOut
	st.lately++
}

// remember keeps the printed value for the comparisons to come. Coincidences count whatever was concluded of them: a series that stands
// still by nature must be able to show it.
func (st *state) remember(t int, u rules.Units, lk *look) {
	st.printed = u
	if u == rules.Missing {
		return
	}
	st.grid.take(t, lk.places)
	st.mark[t&mask] |= lk.mark
	st.count(lk.mark, 1)
	if u == st.lastPrinted {
		st.unchanged = min(st.unchanged+1, 10)
	} else {
		st.unchanged = 0
	}
	st.lastPrinted, st.lastAt = u, t
}
