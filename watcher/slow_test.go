package watcher_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// slowBook has a benchmark, a fund held against it, and lone series. From a date on the fund follows another market, one lone series drifts by
// a deviation a day, and one moves four times as much.
func slowBook(random *rand.Rand, dates, planted int) map[rules.Date][]entry {
	out := map[rules.Date][]entry{}
	first, _ := rules.DateOf(2024, 1, 1) // a Monday
	exact := func(x float64) rules.Units { return rules.Units(math.Round(x*1e8)) * 1e7 }
	for n := range dates {
		d := first + rules.Date(n/5*7+n%5)
		market, other := 0.01*random.NormFloat64(), 0.01*random.NormFloat64()
		followed, drift, scale := market, 0.0, 1.0
		if n >= planted {
			followed, drift, scale = other, 0.01, 4.0
		}
		rows := []entry{{d, "index", exact(market), 0}, {d, "fund", exact(followed + 0.002*random.NormFloat64()), 0},
			{d, "drifter", exact(drift + 0.01*random.NormFloat64()), 0}, {d, "wild", exact(scale * 0.01 * random.NormFloat64()), 0}}
		for s := range 5 {
			rows = append(rows, entry{d, fmt.Sprintf("calm-%d", s), exact(0.01 * random.NormFloat64()), 0})
		}
		out[d] = rows
	}
	return out
}

// passOn is one pass at a moment over the rows of one date, which came before it.
func passOn(t *testing.T, m *memory, at time.Time, rows map[string][]entry, told *[]rules.FlagNews, said *[]string) {
	t.Helper()
	plain := rules.Range{Name: "own", Of: rules.Return, Window: 60, Scale: rules.Plain, Tail: rules.TailModel{Name: "t5"}, Predictive: true,
		Watch: rules.Line{Tail: 0.01}, Breach: rules.Line{Tail: 0.0027}, Pending: rules.Clip}
	residual := plain
	residual.Name, residual.Of = "residual", rules.Residual
	settings := rules.Settings{Ranges: []rules.Range{plain, residual}, References: map[string]string{"fund": "index"}}
	p := &watcher.Pass{Store: m, Source: &shelf{rows}, Settings: settings, Feeds: []rules.Feed{{Name: "book"}},
		FeedKey: func(rules.Feed) string { return "key" }, Now: at, Settled: true, Workers: 2,
		Tell: func(n rules.News) []rules.Notice { *told = append(*told, n.Flags...); return nil },
		Report: func(r watcher.FileReport) {
			if r.Fate == watcher.FateChecked {
				*said = append(*said, r.Why)
			}
		}}
	if _, err := p.Run(context.Background()); err != nil {
		t.Fatal(err)
	}
}

// A pass an evening after a first load: each of the planted changes is found once, by the first pass after a week, on the week's last date;
// nothing is told to a channel, a second pass makes no step, and the weeks of the first load stay unlooked at.
func TestSlowBurnOnceAWeek(t *testing.T) {
	const seed, loaded, dates = 7, 302, 360 // the first load ends on a Tuesday
	t.Logf("seed %d", seed)
	book := slowBook(rand.New(rand.NewPCG(seed, 1)), dates, loaded+8)
	first, _ := rules.DateOf(2024, 1, 1)
	m := &memory{}
	var told []rules.FlagNews
	var said []string
	evening := func(d rules.Date) time.Time { return d.Time().Add(20 * time.Hour) }
	history := []entry{}
	for n := range dates {
		d := first + rules.Date(n/5*7+n%5)
		if history = append(history, book[d]...); n < loaded {
			continue
		}
		name := fmt.Sprintf("f%04d", n)
		rows := map[string][]entry{name: book[d]}
		if n == loaded {
			rows[name] = history
		}
		passOn(t, m, evening(d), rows, &told, &said)
		steps := len(m.batches)
		if passOn(t, m, evening(d).Add(time.Minute), rows, &told, &said); len(m.batches) != steps {
			t.Fatalf("%s: a second pass made a step", d)
		}
	}
	view, _ := m.View()
	seen := map[string]int{}
	_ = view.Flags(true, func(f rules.Flag) bool {
		if !f.Kind.Slow() {
			return true
		}
		t.Logf("%s %s %s raised %s: %s", f.Date, f.Series, f.Kind, f.RaisedAt.Format(time.DateTime), f.Note)
		seen[f.Series+" "+string(f.Kind)]++
		if f.Date.Weekday() != time.Friday || f.RaisedAt != evening(f.Date+3) || f.Standing != rules.Open {
			t.Errorf("%s %s: raised %s for %s, %s", f.Series, f.Kind, f.RaisedAt, f.Date, f.Standing)
		}
		if f.Date < first+rules.Date((loaded+8)/5*7) {
			t.Errorf("%s %s on %s, before anything was planted", f.Series, f.Kind, f.Date)
		}
		return true
	})
	for _, want := range []string{"fund misfit", "drifter drift", "wild volatility"} {
		if seen[want] != 1 {
			t.Errorf("%s: raised %d times, expected once", want, seen[want])
		}
	}
	for _, f := range told {
		if f.Kind.Slow() {
			t.Errorf("a channel was told of %s %s", f.Series, f.Kind)
		}
	}
	if weeks := (dates - loaded + 2) / 5; len(said) != weeks-1 && len(said) != weeks {
		t.Errorf("%d weeks were checked, expected about %d: %v", len(said), weeks, said)
	}
}
