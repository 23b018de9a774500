package backrun

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"strayd/rules"
)

func dates(n int) (out []rules.Date) {
	first, _ := rules.DateOf(2025, 1, 6)
	for d := first; len(out) < n; d++ {
		if wd := d.Weekday(); wd != 0 && wd != 6 {
			out = append(out, d)
		}
	}
	return out
}

// side draws tails that are uniform below widest, so many expected a date, and some flags that no line changes.
func side(r *rand.Rand, n int, perDate float64) *Side {
	s := &Side{Widest: 0.01}
	for d := range n {
		for range int(perDate) + r.IntN(2) {
			t := Tail{Level: 0.01 * r.Float64(), Date: d, Series: r.Uint32N(50), Always: r.IntN(20) == 0}
			t.Breach = t.Level < 0.0027
			s.Tails = append(s.Tails, t)
		}
	}
	for i, d := range dates(n) {
		if i%25 == 0 {
			s.Flags = append(s.Flags, rules.Flag{Date: d, Series: fmt.Sprint("m", i), Kind: rules.KindLimit})
		}
	}
	s.SortTails()
	return s
}

// slowly counts the flags that a level raises, by going through everything.
func slowly(s *Side, level float64, from, to int) (n int) {
	for _, t := range s.Tails {
		if t.Date >= from && t.Date < to && (t.Level < level && !t.Always || t.Always && t.Breach) {
			n++
		}
	}
	for _, f := range s.Flags {
		all := dates(to)
		if at := slices.Index(all, f.Date); at >= from && f.Kind != rules.KindBreach {
			n++
		}
	}
	return n
}

// The level is the last that keeps to the budget: a little more would raise more than it allows. Counted by a plain loop.
func TestAdviceKeepsToTheBudget(t *testing.T) {
	for seed := range uint64(20) {
		r := rand.New(rand.NewPCG(seed, 1))
		n := 100 + r.IntN(300)
		s := side(r, n, 2)
		budget := 2 + 6*r.Float64()
		a := s.Advise(dates(n), budget)
		if a.Level == 0 || a.Why != "" {
			t.Fatalf("seed %d: budget %v: %+v", seed, budget, a)
		}
		allowed := budget * float64(n) / 5
		if got := slowly(s, a.Level, 0, n); got != a.Flags || float64(got) > allowed {
			t.Errorf("seed %d: %d flags at %v, %d by a loop, %.1f allowed", seed, a.Flags, a.Level, got, allowed)
		}
		next := 1.1 * a.Level // two digits: the next level is at most a tenth farther
		if got := slowly(s, next, 0, n); float64(got) <= allowed {
			t.Errorf("seed %d: %d flags at %v too, %.1f allowed, advised %v", seed, got, next, allowed, a.Level)
		}
		if !a.HalfLevel.OK {
			t.Fatalf("seed %d: the first half gives no level", seed)
		}
		if first := slowly(s, a.HalfLevel.V, 0, n/2); float64(first) > budget*float64(n/2)/5 {
			t.Errorf("seed %d: the first half's level raises %d in it", seed, first)
		}
		second := slowly(s, a.HalfLevel.V, 0, n) - slowly(s, a.HalfLevel.V, 0, n/2)
		if want := 5 * float64(second) / float64(n-n/2); math.Abs(want-a.HalfRate.V) > 1e-9 {
			t.Errorf("seed %d: second half %v, by a loop %v", seed, a.HalfRate.V, want)
		}
		if b := s.Advise(dates(n), budget); *b != *a {
			t.Errorf("seed %d: another advice the second time: %+v, %+v", seed, a, b)
		}
	}
}

// Where flags come apart, the resampled rate scatters as a Poisson count does, about 1/sqrt(flags) to either side at one deviation, so that
// the middle 90 % reach 1.645 of it (normal approximation). Where they come in blocks of twenty dates, much wider.
func TestAdviceKnowsHowSureItIs(t *testing.T) {
	apart, clustered := &Side{Widest: 0.01}, &Side{Widest: 0.01}
	r := rand.New(rand.NewPCG(3, 3))
	const n, flags = 1000, 400
	for range flags {
		apart.Tails = append(apart.Tails, Tail{Level: 0.01 * r.Float64(), Date: r.IntN(n)})
		clustered.Tails = append(clustered.Tails, Tail{Level: 0.01 * r.Float64(), Date: 40 * r.IntN(n/40) % 200})
	}
	apart.SortTails()
	clustered.SortTails()
	a := apart.Advise(dates(n), 1)
	half := (a.RateHigh - a.RateLow) / 2 / a.Rate()
	if want := 1.645 / math.Sqrt(float64(a.Flags)); half < 0.7*want || half > 1.4*want {
		t.Errorf("apart: the middle reaches %.3f of the rate, want about %.3f", half, want)
	}
	if a.LevelLow >= a.Level || a.LevelHigh <= a.Level {
		t.Errorf("the level %v is not between %v and %v", a.Level, a.LevelLow, a.LevelHigh)
	}
	c := clustered.Advise(dates(n), 1)
	if wide := (c.RateHigh - c.RateLow) / 2 / c.Rate(); wide < 3*half {
		t.Errorf("clustered: the middle reaches %.3f, apart %.3f", wide, half)
	}
}

func TestAdviceSaysWhyNot(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	for _, c := range []struct {
		dates  int
		budget float64
		level  float64
		why    string
	}{
		{59, 3, 0, "too little data to say: 59 dates, 60 are needed"},
		{250, 0.1, 0, "flags that no breach line changes come to"},
		{250, 1e6, 0.01, "even at 1 % there are fewer than the budget allows"},
	} {
		if a := side(r, c.dates, 2).Advise(dates(c.dates), c.budget); a.Level != c.level || !strings.HasPrefix(a.Why, c.why) {
			t.Errorf("%d dates, budget %v: %+v, want level %v because %q", c.dates, c.budget, a, c.level, c.why)
		}
	}
	many := &Side{Widest: 0.01}
	for n := range 50_000 {
		many.Tails = append(many.Tails, Tail{Level: 0.01 * r.Float64(), Date: n % 250})
	}
	many.SortTails()
	if a := many.Advise(dates(250), 1); a.Level != LeastLevel || !strings.Contains(a.Why, "rarer line than 0.05 %") {
		t.Errorf("a budget for too many series: %+v", a)
	}
	few := &Side{Widest: 0.01, Tails: []Tail{{Level: 1e-5}, {Level: 2e-5, Date: 9}, {Level: 0.001, Date: 11}}}
	if a := few.Advise(dates(250), 0.05); a.Level != 0 || !strings.HasPrefix(a.Why, "too little data to say: the budget comes to 2 flags") {
		t.Errorf("two flags: %+v", a)
	}
}

func TestLevelsAreRoundedDown(t *testing.T) {
	for _, c := range []struct{ level, want float64 }{{0.0027, 0.0027}, {0.00279, 0.0027}, {0.01, 0.01}, {0.000999, 0.00099},
		{0.0042, 0.0042}, {0.0005, 0.0005}} {
		if got := down(c.level); got != c.want {
			t.Errorf("%v: %v, want %v", c.level, got, c.want)
		}
	}
}

// A level is put where it fits: not on limits, nor inside the watch line, nor on a rank range that cannot speak of it (floor 2/(n+1)).
func TestApply(t *testing.T) {
	r := func(name string, change func(*rules.Range)) rules.Range {
		x := rules.Range{Name: name, Of: rules.Return, Window: 60, Scale: rules.Plain, Tail: rules.TailModel{Name: "t", DF: 5}, Side: rules.Both,
			Watch: rules.Line{Tail: 0.01}, Breach: rules.Line{Z: 4}}
		if change != nil {
			change(&x)
		}
		return x
	}
	s := rules.Settings{Ranges: []rules.Range{r("own", nil), r("far", func(x *rules.Range) { x.Watch.Tail = 0.002 }),
		r("rank", func(x *rules.Range) { x.Tail.Name = "rank"; x.Watch.Tail = 0.1; x.Breach = rules.Line{Tail: 0.05} }),
		r("hard", func(x *rules.Range) { x.Limit = &rules.Limit{Low: -1, High: 1} })}}
	got, kept := Apply(s, 0.003)
	if got.Ranges[0].Breach != (rules.Line{Tail: 0.003}) || strings.Join(kept, " ") != "far rank" {
		t.Errorf("%+v, kept %v", got.Ranges[0].Breach, kept)
	}
	for n := 1; n < 4; n++ {
		if got.Ranges[n].Breach != s.Ranges[n].Breach {
			t.Errorf("range %s has another line", s.Ranges[n].Name)
		}
	}
	if s.Ranges[0].Breach.Z != 4 {
		t.Error("the settings that were given changed")
	}
}
