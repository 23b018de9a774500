package watcher_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// market is a book of two groups of ten, one held against an index and one against its peers, with factors, residuals and slips.
func market(r *rand.Rand, dates int) (rows [][]entry) {
	first, _ := rules.DateOf(2024, 1, 1)
	round := func(x float64) rules.Units { return rules.Units(math.Round(x*1e6)) * 1e9 }
	for n := range dates {
		d := first + rules.Date(n/5*7+n%5)
		factor := [2]float64{r.NormFloat64() * 0.01, r.NormFloat64() * 0.01}
		if n%83 == 82 {
			factor[n/83%2] = -0.05
		}
		day := []entry{{d, "index", round(factor[0]), 0}, {d, "eurusd", round(r.NormFloat64() * 0.005), 0}}
		if r.IntN(60) == 0 {
			day[0].value *= -1
		}
		for i := range 20 {
			e := entry{d, fmt.Sprintf("%c%02d", 'a'+i/10, i), round(factor[i/10]*(0.7+0.05*float64(i%10)) + r.NormFloat64()*0.002), 0}
			switch k := r.IntN(300); {
			case k == 0:
				e.value *= 100
			case k == 1:
				e.value = -e.value
			case k == 2:
				e.value = 0
			case k == 3 && n > 0:
				e.value = rows[n-1][len(day)].value
			case k == 4:
				e.value -= 8e12
			case k == 5 && n > 0:
				rows[n-1][len(day)].value += 1e14
				e.value -= 9e13
			}
			day = append(day, e)
		}
		rows = append(rows, day)
	}
	return rows
}

func marketSettings() rules.Settings {
	residual := func(r *rules.Range) { r.Of = rules.Residual }
	s := rules.Settings{Doubtful: 0.002, Ranges: []rules.Range{ranged("own", nil), ranged("rest", residual),
		ranged("weighted", func(r *rules.Range) { residual(r); r.Scale, r.Decay = rules.Weighted, 0.94 })},
		Groups: []rules.Group{{Name: "one", Series: []string{"a*"}, Reference: "index"}, {Name: "two", Series: []string{"b*"}, Reference: "peers"}}}
	s.Register([]rules.Series{{ID: "a03", FX: "eurusd", Start: rules.NoDate, End: rules.NoDate}})
	s.Assigned = nil
	return s
}

// takeRows has a pass take rows, so many dates a file, with the real pool.
func takeRows(t *testing.T, m *memory, rows [][]entry, dates int, settings rules.Settings) {
	t.Helper()
	p := &watcher.Pass{Store: m, Source: byFile(rows, dates), Settings: settings, Feeds: []rules.Feed{{Name: "book"}}, Workers: 2,
		FeedKey: func(rules.Feed) string { return "key" }, Now: time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC), Settled: true}
	if _, err := p.Run(context.Background()); err != nil {
		t.Fatal(err)
	}
}

// loneSettings have no group: every series is weighed by its own past.
func loneSettings() rules.Settings {
	return rules.Settings{Doubtful: 0.002, Ranges: []rules.Range{ranged("own", nil)}}
}

// Lone series are weighed alike, however their dates come; their errors are named and left out.
func TestLoneSeriesInOneFileOrMany(t *testing.T) {
	const history, days = 100, 80
	for seed := range uint64(2) {
		rows := market(rand.New(rand.NewPCG(seed, 11)), history+days)
		var flags, used []string
		for n, dates := range []int{1, 9, days} {
			m := &memory{}
			takeRows(t, m, rows[:history], history, loneSettings())
			if dates == 1 {
				for n := range days {
					takeRows(t, m, rows[history+n:history+n+1], 1, loneSettings())
				}
			} else {
				takeRows(t, m, rows[history:], dates, loneSettings())
			}
			f, u := told(t, m), taken(t, m, rows)
			if n == 0 {
				flags, used = f, u
				weighedAgain(t, m)
				for _, kind := range []string{"breach x100", "spike-reversal", "stale zero", "repeat repeat"} {
					if !strings.Contains(strings.Join(f, "\n"), kind) {
						t.Errorf("seed %d: no flag says %q", seed, kind)
					}
				}
			}
			differ(t, fmt.Sprintf("seed %d, %d dates a file: flags", seed, dates), f, flags)
			differ(t, fmt.Sprintf("seed %d, %d dates a file: used values", seed, dates), u, used)
			if v, _ := m.View(); watcher.Recheck(v, nil) != nil {
				t.Errorf("seed %d: %v", seed, watcher.Recheck(v, nil))
			}
		}
	}
}

// With the real pool too, the same flags stand and the windows take the same, whether dates come in one file, in many files of a pass, or
// each in a pass of its own; a second look at the same files changes nothing; and what explain weighs again is what the flags say.
func TestRealPoolInOneFileOrMany(t *testing.T) {
	if testing.Short() {
		t.Skip("many passes")
	}
	const history, days = 260, 60
	for seed := range uint64(1) {
		t.Logf("seed %d", seed)
		rows := market(rand.New(rand.NewPCG(seed, 3)), history+days)
		var flags, used []string
		for n, way := range []string{"a pass a day", "a file a day", "one file"} {
			m := &memory{}
			takeRows(t, m, rows[:history], history, marketSettings())
			switch way {
			case "a pass a day":
				for n := range days {
					takeRows(t, m, rows[history+n:history+n+1], 1, marketSettings())
				}
			case "a file a day":
				takeRows(t, m, rows[history:], 1, marketSettings())
			default:
				takeRows(t, m, rows[history:], days, marketSettings())
			}
			f, u := told(t, m), taken(t, m, rows)
			newDefinition(t, m).flags()
			if n == 0 {
				flags, used = f, u
				weighedAgain(t, m)
				steps := len(m.batches)
				takeRows(t, m, rows[history+days-1:], 1, marketSettings())
				if len(m.batches) != steps {
					t.Error("a second look makes a step")
				}
				for _, kind := range []string{"breach", "doubtful", "market-day", "spike-reversal", "reference-wrong", "x100", "sign", "market {", "rest breach", "weighted breach"} {
					if !strings.Contains(strings.Join(f, "\n"), kind) {
						t.Errorf("seed %d: no flag says %q", seed, kind)
					}
				}
			}
			differ(t, fmt.Sprintf("seed %d, %s: flags", seed, way), f, flags)
			differ(t, fmt.Sprintf("seed %d, %s: used values", seed, way), u, used)
			if v, _ := m.View(); watcher.Recheck(v, nil) != nil {
				t.Errorf("seed %d, %s: %v", seed, way, watcher.Recheck(v, nil))
			}
		}
	}
}

// weighedAgain holds what a Reader weighs again against the flags. A flag that a later date settled says another cause by then.
func weighedAgain(t *testing.T, m *memory) {
	t.Helper()
	v, _ := m.View()
	r, err := watcher.NewReader(v)
	if err != nil {
		t.Fatal(err)
	}
	held := 0
	if err := v.Flags(true, func(f rules.Flag) bool {
		if f.Series == "" || f.Standing == rules.OfHistory || strings.Contains(f.Note, "looked like") {
			return true
		}
		held++
		w, err := r.Weigh(f.Series, f.Date, f.Step)
		switch {
		case err != nil:
			t.Fatal(err)
		case f.LooksLike == rules.CauseMarket && !f.Share.OK, f.LooksLike == "" && w != nil && w.View == nil: // the pool has no view of it
		case w == nil || w.View == nil:
			t.Errorf("%s %s: nothing is weighed again, and the flag looks like %q", f.Date, f.Series, f.LooksLike)
		case w.View.LooksLike != f.LooksLike || f.Share.OK && w.View.Share != f.Share.V || w.View.Residual != f.Residual:
			t.Errorf("%s %s: weighed again it is %q %v %v, and the flag says %q %v %v", f.Date, f.Series, w.View.LooksLike, w.View.Share, w.View.Residual,
				f.LooksLike, f.Share, f.Residual)
		}
		return true
	}); err != nil {
		t.Fatal(err)
	}
	if held < 10 {
		t.Errorf("only %d flags were weighed again", held)
	}
}

// A residual range that comes into the settings later has the residuals that it would have had from the start, and its windows hold them.
func TestResidualRangeComesLater(t *testing.T) {
	rows := market(rand.New(rand.NewPCG(5, 3)), 200)
	from := func(before rules.Settings) []string {
		m := &memory{}
		takeRows(t, m, rows[:180], 180, before)
		takeRows(t, m, rows[180:], 10, marketSettings())
		v, _ := m.View()
		if err := watcher.Recheck(v, nil); err != nil {
			t.Error(err)
		}
		var out []string
		for _, line := range taken(t, m, rows) {
			if strings.HasPrefix(line, "residuals ") {
				out = append(out, line)
			}
		}
		return out
	}
	plain := marketSettings()
	plain.Ranges = plain.Ranges[:1]
	want := from(marketSettings())
	if len(want) < 180*10 {
		t.Fatalf("only %d residuals", len(want))
	}
	differ(t, "later", from(plain), want)
}
