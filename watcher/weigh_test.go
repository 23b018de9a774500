package watcher_test

import (
	"context"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// shelves are the files of several feeds.
type shelves map[string]*shelf

func (s shelves) Find(f rules.Feed, now time.Time, settled bool) (watcher.Found, error) {
	return s[f.Name].Find(f, now, settled)
}

func (s shelves) Read(ctx context.Context, c watcher.Candidate, f rules.Feed, names *watcher.Names, now time.Time, p watcher.Progress) (*watcher.Sheet, error) {
	return s[f.Name].Read(ctx, c, f, names, now, p)
}

// weighFeeds takes every file of some feeds in one pass with the stand-in.
func weighFeeds(t *testing.T, m *memory, s watcher.Source, feeds []string, settings rules.Settings, workers int) {
	t.Helper()
	p := &watcher.Pass{Store: m, Source: s, Settings: settings, FeedKey: func(rules.Feed) string { return "key" },
		Now: time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC), Settled: true, Workers: workers}
	for _, f := range feeds {
		p.Feeds = append(p.Feeds, rules.Feed{Name: f})
	}
	p.SetWeigher(newPlainPool)
	if _, err := p.Run(context.Background()); err != nil {
		t.Fatal(err)
	}
}

// weighRun takes every file of a shelf in one pass with the stand-in.
func weighRun(t *testing.T, m *memory, s *shelf, settings rules.Settings, workers int) {
	t.Helper()
	weighFeeds(t, m, s, []string{"book"}, settings, workers)
}

func weighSettings() rules.Settings {
	return rules.Settings{Doubtful: 0.002, Ranges: []rules.Range{ranged("own", func(*rules.Range) {})},
		Groups: []rules.Group{{Name: "all", Series: []string{"s*"}, Reference: "none"}}}
}

// quiet is a book of steady series: weekdays from a Monday on, values of about 0.1 %.
func quiet(series, dates int, r *rand.Rand) (rows [][]entry) {
	first, _ := rules.DateOf(2025, 1, 6)
	for n := range dates {
		var day []entry
		for s := range series {
			day = append(day, entry{first + rules.Date(n/5*7+n%5), fmt.Sprintf("s%02d", s), rules.Units(1e12 + r.Int64N(1e11)*(1-2*r.Int64N(2))), 0})
		}
		rows = append(rows, day)
	}
	return rows
}

// byFile puts so many dates into a file.
func byFile(rows [][]entry, dates int) *shelf {
	s := &shelf{map[string][]entry{}}
	for n, day := range rows {
		name := "f" + rows[n/dates*dates][0].date.String()
		s.files[name] = append(s.files[name], day...)
	}
	return s
}

// told lists the flags that stand, without what depends on how the values arrived.
func told(t *testing.T, m *memory) (out []string) {
	t.Helper()
	v, _ := m.View()
	if err := v.Flags(true, func(f rules.Flag) bool {
		out = append(out, toldOf(&f))
		return true
	}); err != nil {
		t.Fatal(err)
	}
	slices.Sort(out)
	return out
}

func toldOf(f *rules.Flag) string {
	return fmt.Sprintf("%s %s %s%s %s %s %v %v %v %s ref %q %v %v: %s", f.Date, f.Series, f.Group, f.Range, f.Kind, f.LooksLike, f.Share, f.Implied,
		f.Return, fmt.Sprint(f.Low, f.High, f.Z, f.Tail), f.Reference, f.ReferenceReturn, f.Residual, f.Note)
}

// taken lists every used value that differs from its return, as it stands.
func taken(t *testing.T, m *memory, rows [][]entry) (out []string) {
	t.Helper()
	v, _ := m.View()
	names, _ := v.Names()
	ranges, _ := v.Ranges()
	for _, r := range ranges {
		for _, day := range rows {
			cells := make([]int64, names.Len())
			for i := range cells {
				cells[i] = 1
			}
			if err := v.Patch(r.ID, day[0].date, 0, 0, cells); err != nil {
				t.Fatal(err)
			}
			for i, x := range cells {
				if x != 1 {
					out = append(out, fmt.Sprintf("%s %s %s %d", strings.TrimRight(r.Key[:min(12, len(r.Key))], " "), day[0].date, names.Name(uint32(i)), x))
				}
			}
		}
	}
	slices.Sort(out)
	return out
}

func TestViewsBecomeFlags(t *testing.T) {
	rows := quiet(5, 40, rand.New(rand.NewPCG(1, 1)))
	rows[30][0].value = 4.5e12 // beyond four times and beyond its range
	rows[31][1].value = 9e12   // out
	rows[32][1].value = -95e11 // and taken back
	for i := range 4 {
		rows[38][i].value = -39e11 // the market; the last did not move
	}
	m := &memory{}
	weighRun(t, m, byFile(rows, 1), weighSettings(), 2)
	weighRun(t, m, byFile(rows, 1), weighSettings(), 2) // changes nothing
	got := strings.Join(told(t, m), "\n")
	for _, want := range []string{
		rows[30][0].date.String() + " s00 allown breach genuine {0.6 true} {0 false} 0.0045",
		rows[31][1].date.String() + " s01 allown breach spike-reversal {0.9 true} {0 false} 0.009",
		"looked like x100 (70 %) until " + rows[32][1].date.String(),
		rows[38][0].date.String() + "  all market-day  {0 false} {0 false} -0.0039",
		"5 series with a value, median distance 3.4 deviations; did not move: s04",
	} {
		if !strings.Contains(got, want) {
			t.Errorf("%q is not told in\n%s", want, got)
		}
	}
	if strings.Contains(got, rows[32][1].date.String()+" s01") {
		t.Errorf("the reversal raises a flag of its own\n%s", got)
	}
	if n := strings.Count(got, "market-day"); n != 1 {
		t.Errorf("%d flags of a market day, want 1", n)
	}
}

// However many dates come in a file, and with however many workers, the same flags stand and the windows take the same.
func TestWeighedAlikeInOneFileOrMany(t *testing.T) {
	for seed := range uint64(3) {
		r := rand.New(rand.NewPCG(seed, 7))
		rows := quiet(9, 120, r)
		for range 40 {
			d, s := 15+r.IntN(100), r.IntN(9)
			x := rules.Units(1e12 * (1 + r.Int64N(30)))
			rows[d][s].value = x
			if r.IntN(2) == 0 {
				rows[d+1][s].value = -x
			}
		}
		for i := range 9 {
			rows[110][i].value *= -5
		}
		var flags, used []string
		for n, dates := range []int{1, 7, 1000} {
			m := &memory{}
			if dates == 1 {
				dayByDay(t, m, rows)
			} else {
				weighRun(t, m, byFile(rows, dates), weighSettings(), 1+n)
			}
			f, u := told(t, m), taken(t, m, rows)
			if n == 0 {
				flags, used = f, u
				if len(f) < 30 {
					t.Fatalf("only %d flags", len(f))
				}
				continue
			}
			differ(t, fmt.Sprintf("seed %d, %d dates a file: flags", seed, dates), f, flags)
			differ(t, fmt.Sprintf("seed %d, %d dates a file: used values", seed, dates), u, used)
			if v, _ := m.View(); watcher.Recheck(v, nil) != nil {
				t.Errorf("seed %d: %v", seed, watcher.Recheck(v, nil))
			}
		}
	}
}

func dayByDay(t *testing.T, m *memory, rows [][]entry) {
	t.Helper()
	for n, day := range rows {
		weighRun(t, m, &shelf{map[string][]entry{fmt.Sprintf("d%04d", n): day}}, weighSettings(), 1)
	}
}

func differ(t *testing.T, what string, got, want []string) {
	t.Helper()
	for _, g := range got {
		if !slices.Contains(want, g) {
			t.Errorf("%s: not otherwise:\n%s", what, g)
		}
	}
	for _, w := range want {
		if !slices.Contains(got, w) {
			t.Errorf("%s: missing:\n%s", what, w)
		}
	}
}

// A reference that comes in a file after its followers' has them judged anew: the same flags stand as where it comes before, whether all
// history comes in two files or each day in two.
func TestLateReference(t *testing.T) {
	for seed := range uint64(2) {
		r := rand.New(rand.NewPCG(seed, 9))
		rows := quiet(8, 60, r)
		index := quiet(1, 60, r)
		for n := range index {
			index[n][0].series = "index"
			if r.IntN(6) == 0 {
				index[n][0].value *= 6
			}
		}
		settings := weighSettings()
		settings.Groups[0].Reference = "index"
		var want []string
		for _, dates := range []int{1, 60} {
			for _, order := range []string{"index book", "book index"} {
				m := &memory{}
				for n := 0; n < len(rows); n += dates {
					feeds := shelves{"book": byFile(rows[n:n+dates], dates), "index": byFile(index[n:n+dates], dates)}
					weighFeeds(t, m, feeds, strings.Fields(order), settings, 2)
				}
				got := told(t, m)
				if want == nil {
					if want = got; !strings.Contains(strings.Join(want, "\n"), "doubtful sign {0.8 true}") {
						t.Fatalf("seed %d: no value is doubtful by its reference", seed)
					}
				}
				differ(t, fmt.Sprintf("seed %d, %d dates a file, feeds %s", seed, dates, order), got, want)
				if v, _ := m.View(); watcher.Recheck(v, nil) != nil {
					t.Errorf("seed %d: %v", seed, watcher.Recheck(v, nil))
				}
			}
		}
	}
}
