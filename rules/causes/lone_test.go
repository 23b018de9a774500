package causes

import (
	"math/rand/v2"
	"testing"

	"strayd/rules"
)

// lonePast is 250 returns of a deviation of 1 %, printed at some decimals of a fraction.
func lonePast(random *rand.Rand, places int) []rules.Units {
	past := make([]rules.Units, span)
	for k := range past {
		past[k] = printed(random.NormFloat64()*0.01, places)
	}
	return past
}

func printed(r float64, places int) rules.Units {
	tick := rules.Units(rules.Pow10(rules.Places - places))
	return rules.Units(r*1e15) / tick * tick
}

// What a lone series can tell: the catalogue of practice, rows 1, 2, 6, 7, 9 and 12, with values that leave no doubt.
func TestLoneNames(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 3))
	for range 50 {
		past := lonePast(random, 6)
		last := past[len(past)-1]
		for _, c := range []struct {
			before, u rules.Units
			kind      rules.Kind
			looks     rules.Cause
			earlier   bool
		}{
			{last, 0, rules.KindStale, rules.CauseZero, false},
			{last, last, rules.KindRepeat, rules.CauseRepeat, false},
			{last, 812_300_000_000_000, rules.KindDoubtful, rules.CauseX100, false},
			{last, 91_230_000_000_000_000, rules.KindDoubtful, rules.CauseX10000, false},
			{last, -497_234_000_000_000, rules.KindDoubtful, rules.CauseSplit, false},
			{last, 71_234_000_000_000, "", rules.CauseGenuine, false},
			{250_000_000_000_000, -201_234_000_000_000, "", rules.CauseSpike, true},
		} {
			if c.u == last && last == 0 {
				continue
			}
			v, earlier := NewLone().Weigh(past, c.before, 19000, c.u)
			if v.Kind != c.kind || v.LooksLike != c.looks || earlier != c.earlier {
				t.Errorf("%v after %v: kind %q, looks like %q, earlier %v, want %q, %q, %v", c.u, c.before, v.Kind, v.LooksLike, earlier, c.kind,
					c.looks, c.earlier)
			}
		}
	}
}

// Ordinary values that are weighed because they happen to be zero or repeated, at two decimals and four: flags stay below the default share
// of 0.2 % of all values.
func TestLoneIsQuiet(t *testing.T) {
	random := rand.New(rand.NewPCG(4, 4))
	for _, places := range []int{4, 6} {
		lone, flags := NewLone(), 0
		const n = 40_000
		past := lonePast(random, places)
		for range n {
			u := printed(random.NormFloat64()*0.01, places)
			before := past[len(past)-1]
			if Calls(u, before, true) {
				if v, _ := lone.Weigh(past, before, 19000, u); v.Kind != "" {
					flags++
				}
			}
			past = append(past[1:], u)
		}
		if flags > n*2/1000 {
			t.Errorf("%d decimals: %d flags in %d values, more than 0.2 %%", places, flags, n)
		}
	}
}

// A series that repeats and stands still by nature is not flagged for it: of 250 values every fifth is zero, every fourth repeats.
func TestLoneKnowsNaturalRepeats(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 5))
	past := lonePast(random, 6)
	for k := range past {
		switch {
		case k%5 == 0:
			past[k] = 0
		case k%4 == 0:
			past[k] = past[k-1]
		}
	}
	lone := NewLone()
	last := past[len(past)-1]
	for _, u := range []rules.Units{0, last} {
		if v, _ := lone.Weigh(past, last, 19000, u); v.Kind != "" {
			t.Errorf("%v is flagged %q", u, v.Kind)
		}
	}
}

func TestLoneNeedsAPast(t *testing.T) {
	past := lonePast(rand.New(rand.NewPCG(6, 6)), 6)
	for n := range leastSeen {
		if v, _ := NewLone().Weigh(past[:n], rules.Missing, 19000, 0); v.Kind != "" || v.LooksLike != "" {
			t.Errorf("after %d values: %+v", n, v)
		}
	}
}

func BenchmarkLone(b *testing.B) {
	past := lonePast(rand.New(rand.NewPCG(7, 7)), 6)
	lone := NewLone()
	for b.Loop() {
		lone.Weigh(past, past[span-1], 19000, 0)
	}
}
