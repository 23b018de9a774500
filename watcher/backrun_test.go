package watcher_test

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/rules/backrun"
	"strayd/watcher"
)

// pastOf reads all that a store holds.
func pastOf(t *testing.T, m *memory) *watcher.Past {
	t.Helper()
	v, _ := m.View()
	p, err := watcher.ReadPast(context.Background(), v, nil)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func backRun(t *testing.T, p *watcher.Past, s rules.Settings, workers int) *backrun.Side {
	t.Helper()
	side, err := p.Judge(context.Background(), watcher.BackRun{Settings: s, From: p.Dates[0], Workers: workers, Now: time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC)})
	if err != nil {
		t.Fatal(err)
	}
	return side
}

func toldBy(s *backrun.Side) (out []string) {
	for i := range s.Flags {
		out = append(out, toldOf(&s.Flags[i]))
	}
	slices.Sort(out)
	return out
}

// Under the settings that were in force, a back-run raises the flags that the passes raised, a file a date, to the last figure: of groups,
// references and peers, of lone series, and of values over several days. Nothing that it is given changes.
func TestBackRunSaysWhatThePassesSaid(t *testing.T) {
	for seed := range uint64(2) {
		t.Logf("seed %d", seed)
		rows := market(rand.New(rand.NewPCG(seed, 3)), 300)
		for name, settings := range map[string]rules.Settings{"market": marketSettings(), "lone": loneSettings()} {
			m := &memory{}
			takeRows(t, m, rows[:260], 260, settings)
			takeRows(t, m, rows[260:], 1, settings)
			batches := fmt.Sprintf("%+v", m.batches)
			p := pastOf(t, m)
			for _, before := range otherSettings(settings) { // what a back-run keeps for the next must not show there
				backRun(t, p, before, 2)
			}
			for _, workers := range []int{1, 3} {
				got := toldBy(backRun(t, p, settings, workers))
				if len(got) < 20 {
					t.Errorf("seed %d, %s: only %d flags", seed, name, len(got))
				}
				differ(t, fmt.Sprintf("seed %d, %s, %d workers: flags", seed, name, workers), got, told(t, m))
			}
			if fmt.Sprintf("%+v", m.batches) != batches {
				t.Errorf("seed %d, %s: the store changed", seed, name)
			}
		}
	}
}

// otherSettings are some for which a pool would say something else, or the same about less.
func otherSettings(s rules.Settings) []rules.Settings {
	apart, strict, fewer := s, s, s
	apart.Groups, strict.Doubtful, fewer.Ranges = nil, 0.05, s.Ranges[:1]
	return []rules.Settings{apart, strict, fewer}
}

// The same for ranges of every scale, tail and side, and for values that cover several business days.
func TestBackRunOfEveryShape(t *testing.T) {
	for _, spans := range []bool{false, true} {
		r := rand.New(rand.NewPCG(5, 7))
		s := &shelf{randomFiles(r, 66, 60, false)}
		for _, name := range sortedFiles(s) {
			for n := range s.files[name] {
				if s.files[name][n].days = 0; spans {
					if s.files[name][n].days = 1; r.IntN(12) == 0 {
						s.files[name][n].days = 2 + r.IntN(4)
					}
				}
			}
		}
		settings := rules.Settings{Ranges: shapes(), Groups: groups()}
		m := &memory{}
		p := &watcher.Pass{Store: m, Source: s, Settings: settings, Feeds: []rules.Feed{{Name: "book", Columns: rules.Columns{Days: "days"}}}, Workers: 2,
			FeedKey: func(rules.Feed) string { return "key" }, Now: time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC), Settled: true}
		if _, err := p.Run(context.Background()); err != nil {
			t.Fatal(err)
		}
		want := slices.DeleteFunc(told(t, m), func(f string) bool { return strings.Contains(f, " missing  ") }) // that is about a file
		if len(want) < 100 {
			t.Errorf("spans %v: only %d flags", spans, len(want))
		}
		differ(t, fmt.Sprintf("spans %v: flags", spans), toldBy(backRun(t, pastOf(t, m), settings, 2)), want)
	}
}

// A back-run ends where it is when it is told to: while the pool goes forward, and between two tasks.
func TestBackRunStops(t *testing.T) {
	weighed, many := &memory{}, &memory{}
	takeRows(t, weighed, market(rand.New(rand.NewPCG(1, 3)), 80), 80, marketSettings())
	run(t, many, &shelf{randomFiles(rand.New(rand.NewPCG(1, 4)), 400, 10, false)}, loneSettings(), 1)
	for work, m := range map[string]*memory{"weighing": weighed, "judging": many} {
		settings := marketSettings()
		if m == many {
			settings = loneSettings()
		}
		ctx, stop := context.WithCancel(context.Background())
		_, err := pastOf(t, m).Judge(ctx, watcher.BackRun{Settings: settings, Workers: 1, Progress: func(at string, _, _ int64) {
			if at == work {
				stop()
			}
		}})
		if !errors.Is(err, context.Canceled) {
			t.Errorf("stopped while %s: %v", work, err)
		}
	}
}
