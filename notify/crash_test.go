package notify

import (
	"context"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

// A crash at every step of the state machine, before it and after it, with a channel that knows what arrived and one that does
// not: each notice takes three steps, the mark before the call, the call, and the mark of its outcome.
func TestCrashAtEveryStep(t *testing.T) {
	const notices = 3
	for _, blind := range []bool{false, true} {
		for at := 1; at <= 3*notices; at++ {
			for _, applied := range []bool{false, true} {
				bubble(t, func(t *testing.T) {
					m, f := &memory{}, &finder{chat: newChat(), blind: blind}
					m.fill("desk", notices)
					crash(m, f, at, applied)
					afterCrashes(t, fmt.Sprintf("at %d, applied %v, blind %v", at, applied, blind), m, f, notices, 1)
				})
			}
		}
	}
}

// Many crashes in a row: nothing is lost, and there is at most one repeat a crash.
func TestManyCrashes(t *testing.T) {
	for seed := range uint64(300) {
		bubble(t, func(t *testing.T) {
			r := rand.New(rand.NewPCG(seed, 1))
			m, f := &memory{}, &finder{chat: newChat(), blind: r.IntN(2) == 0}
			notices, crashes := 1+r.IntN(6), 1+r.IntN(6)
			m.fill("desk", notices)
			for range crashes {
				crash(m, f, 1+r.IntN(5), r.IntN(2) == 0)
			}
			afterCrashes(t, fmt.Sprintf("seed %d", seed), m, f, notices, crashes)
		})
	}
}

// crash runs a sender that dies at one of its steps, counted from 1, after it or before it. What it does then leaves no trace. With
// fewer steps left it is stopped after a while.
func crash(m *memory, f *finder, at int, applied bool) {
	ctx, die := context.WithTimeout(context.Background(), time.Hour)
	defer die()
	steps := 0
	step := func() (happens bool) {
		steps++
		if steps >= at {
			die()
		}
		return steps < at || steps == at && applied
	}
	m.before = func(rules.Notice) error {
		if !step() {
			return errFrozen
		}
		return nil
	}
	post := func(context.Context, rules.Notice) (bool, error) {
		if happens := step(); steps >= at {
			return happens, &Failure{Class: Ambiguous, Reason: "nobody hears this"}
		}
		return true, nil
	}
	f.script = slices.Repeat([]func(context.Context, rules.Notice) (bool, error){post}, 100)
	NewSender(Sending{Outbox: m, Routes: one(f), Jitter: none, Grace: time.Nanosecond}).Run(ctx)
	m.before, f.script = nil, nil
}

// afterCrashes lets a sender finish the work and counts.
func afterCrashes(t *testing.T, what string, m *memory, f *finder, notices, crashes int) {
	t.Helper()
	sendFor(time.Hour, Sending{Outbox: m, Routes: one(f)})
	equal(t, what+": states", m.states(), strings.TrimSpace(strings.Repeat("sent ", notices)))
	first := []uint64{}
	for _, n := range f.arrived {
		if !slices.Contains(first, n) {
			first = append(first, n)
		}
	}
	want := make([]uint64, notices)
	for i := range want {
		want[i] = uint64(i + 1)
	}
	equal(t, what+": all arrived, in order", first, want)
	repeats := len(f.arrived) - notices
	if !f.blind && repeats > 0 || repeats > crashes {
		t.Errorf("%s: %d repeats: %v", what, repeats, f.posts)
	}
	if said := strings.Count(fmt.Sprint(f.posts), "(possible repeat)"); said < repeats {
		t.Errorf("%s: %d repeats, %d say so: %v", what, repeats, said, f.posts)
	}
}
