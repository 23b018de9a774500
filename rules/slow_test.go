package rules_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/rules"
)

// runLength is the mean number of steps to the first signal of either side.
func runLength(random *rand.Rand, runs int, clip float64, draw func(*rand.Rand) float64) float64 {
	total := 0
	for range runs {
		c := rules.NewCUSUM()
		c.Clip = clip
		for !c.Up.On && !c.Down.On {
			c.Step(draw(random))
			total++
		}
	}
	return float64(total) / float64(runs)
}

// Average run lengths of the two-sided CUSUM with k = 0.5 and h = 5. Unclipped normal: 465 at no shift, 38.0 at half a deviation, 10.4 at one
// (Montgomery, Introduction to Statistical Quality Control, two-sided run lengths). 468, 39, 10, and 277 for t5 values, which clipping at 2.5
// brings to 848: PRACTICE.md 3.1. All are of the two sides together; one side alone runs twice as long (938 at no shift).
func TestDriftRunLengths(t *testing.T) {
	const seed = 11
	normal := func(shift float64) func(*rand.Rand) float64 {
		return func(r *rand.Rand) float64 { return r.NormFloat64() + shift }
	}
	for _, c := range []struct {
		name            string
		clip            float64
		draw            func(*rand.Rand) float64
		runs            int
		want, tolerance float64
	}{
		{"normal, unclipped", math.Inf(1), normal(0), 4000, 465, 0.06},
		{"half a deviation, unclipped", math.Inf(1), normal(0.5), 4000, 38, 0.06},
		{"one deviation, unclipped", math.Inf(1), normal(1), 4000, 10.4, 0.05},
		{"half a deviation, clipped", 2.5, normal(0.5), 4000, 39, 0.12},
		{"one deviation, clipped", 2.5, normal(1), 4000, 10, 0.12},
		{"t5, unclipped", math.Inf(1), t5, 4000, 277, 0.15},
		{"t5, clipped", 2.5, t5, 4000, 848, 0.15},
	} {
		got := runLength(rand.New(rand.NewPCG(seed, 1)), c.runs, c.clip, c.draw)
		t.Logf("seed %d: %s: %.1f, expected %.1f", seed, c.name, got, c.want)
		if math.Abs(got/c.want-1) > c.tolerance {
			t.Errorf("%s: average run length %.1f, expected %.1f", c.name, got, c.want)
		}
	}
}

// t5 is a Student t with 5 degrees of freedom scaled to unit variance.
func t5(r *rand.Rand) float64 {
	chi := 0.0
	for range 5 {
		x := r.NormFloat64()
		chi += x * x
	}
	return r.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5)
}

// The ratio of deviations of 20 to 250 normal values lies below 0.59 or above 1.46 in one case of a hundred, half of them on each side:
// PRACTICE.md 3.1, from quantiles of F(19, 249). Beyond the wide limits there is hardly one.
func TestScaleRatioQuantiles(t *testing.T) {
	const seed, runs = 5, 40000
	random := rand.New(rand.NewPCG(seed, 2))
	ratios := make([]float64, runs)
	values := make([]float64, 270)
	for n := range ratios {
		for i := range values {
			values[i] = 0.01 * random.NormFloat64()
		}
		ratio, ok := rules.ScaleRatio(values)
		if !ok {
			t.Fatal("no ratio of 270 values")
		}
		ratios[n] = ratio
	}
	slices.Sort(ratios)
	low, high := ratios[runs/200], ratios[runs-runs/200]
	t.Logf("seed %d: 0.5 %% lie below %.3f, 0.5 %% above %.3f", seed, low, high)
	if math.Abs(low-0.59) > 0.015 || math.Abs(high-1.46) > 0.015 {
		t.Errorf("quantiles %.3f and %.3f, expected 0.59 and 1.46", low, high)
	}
	if ratios[runs/500] < 0.5 || ratios[runs-1] > 2 {
		t.Errorf("wide limits are passed: %.3f, %.3f", ratios[runs/500], ratios[runs-1])
	}
}

// Spearman's example of ten pairs without ties: 1 - 6 sum(d^2) / (n(n^2-1)) with sum(d^2) = 194 is -29/165 (the worked example of the
// article on the coefficient in Wikipedia). With ties the mean ranks count: x 1 2 2 3, y 1 2 3 4 has deviations of ranks
// -1.5 0 0 1.5 and -1.5 -0.5 0.5 1.5, hence 4.5/sqrt(4.5 x 5).
func TestSpearman(t *testing.T) {
	x := []float64{106, 100, 86, 101, 99, 103, 97, 113, 112, 110}
	y := []float64{7, 27, 2, 50, 28, 29, 20, 12, 6, 17}
	if r, ok := rules.Spearman(x, y); !ok || math.Abs(r+29.0/165) > 1e-12 {
		t.Errorf("rank correlation %v, expected %v", r, -29.0/165)
	}
	if r, ok := rules.Spearman([]float64{1, 2, 2, 3}, []float64{1, 2, 3, 4}); !ok || math.Abs(r-4.5/math.Sqrt(22.5)) > 1e-12 {
		t.Errorf("with ties %v", r)
	}
	if _, ok := rules.Spearman([]float64{1, 1, 1}, []float64{1, 2, 3}); ok {
		t.Error("a constant list has a rank correlation")
	}
}

const slowMonday = rules.Date(20000 - 20000%7 + 4) // 1970-01-05 was day 4, a Monday

// slowPast invents a referenced series on weekdays up to a Sunday: returns of a market plus residuals.
func slowPast(random *rand.Rand, n int, change func(at int, market, residual float64) (float64, float64)) rules.SlowPast {
	p := rules.SlowPast{Residuals: []float64{}}
	for at, d := 0, slowMonday; at < n; d++ {
		if (d-slowMonday)%7 > 4 {
			continue
		}
		market, e := change(at, 0.01*random.NormFloat64(), 0.002*random.NormFloat64())
		p.Dates, p.Returns, p.Residuals = append(p.Dates, d), append(p.Returns, market+e), append(p.Residuals, e)
		at++
	}
	return p
}

// What is planted at observation 440 of 500 is found, each under its kind, and nothing is found in calm series but now and then.
func TestSlowFindings(t *testing.T) {
	since := func(from int, what func(market, e float64) (float64, float64)) func(int, float64, float64) (float64, float64) {
		return func(at int, market, e float64) (float64, float64) {
			if at >= from {
				return what(market, e)
			}
			return market, e
		}
	}
	for _, c := range []struct {
		name, want string
		change     func(int, float64, float64) (float64, float64)
	}{
		{"bias of a deviation upwards", "drift true ", since(440, func(m, e float64) (float64, float64) { return m, e + 0.002 })},
		{"bias downwards", "drift false ", since(440, func(m, e float64) (float64, float64) { return m, e - 0.002 })},
		{"residuals smoothed", "volatility false ", since(480, func(m, e float64) (float64, float64) { return m, e / 5 })},
		{"residuals wild", "volatility true ", since(480, func(m, e float64) (float64, float64) { return m, e * 4 })},
		{"wrong reference", "misfit ", func(at int, m, e float64) (float64, float64) {
			if at >= 450 { // what was foreseen is another market's move: the residual is the move and what is foreseen of the other
				other := 0.01 * math.Sin(float64(at)*float64(at))
				return other, m + e - other
			}
			return m, e
		}},
	} {
		hits := 0
		for seed := range uint64(20) {
			p := slowPast(rand.New(rand.NewPCG(seed, 3)), 500, c.change)
			got := p.Findings(p.Dates[len(p.Dates)-1])
			for _, f := range got {
				if f.Kind == rules.Kind(wordOf(c.want)) && (f.Kind == rules.KindMisfit || c.want == fmt.Sprintf("%s %t ", f.Kind, f.Up)) {
					hits++
				}
			}
		}
		t.Logf("seeds 0 to 19: %s: found in %d of 20", c.name, hits)
		if hits < 18 {
			t.Errorf("%s: found in %d of 20", c.name, hits)
		}
	}
	calm := 0
	for seed := range uint64(200) {
		p := slowPast(rand.New(rand.NewPCG(seed, 4)), 500, func(_ int, m, e float64) (float64, float64) { return m, e })
		if got := p.Findings(p.Dates[499]); len(got) > 0 {
			calm++
		}
	}
	t.Logf("seeds 0 to 199: something found in %d of 200 calm series", calm)
	if calm > 16 { // a spell of about 15 observations every 850 is 2 % of days; estimated means make it more
		t.Errorf("something is found in %d of 200 calm series", calm)
	}
}

func wordOf(s string) string {
	var w string
	_, _ = fmt.Sscan(s, &w)
	return w
}

// A finding is news once in its spell: not while the flag of it asks something, not while it lasts after that, and again after a week
// without it.
func TestSlowNewsOncePerSpell(t *testing.T) {
	wild := func(from, to int) func(int, float64, float64) (float64, float64) {
		return func(at int, m, e float64) (float64, float64) {
			if at >= from && at < to {
				return m, 6 * e
			}
			return m, e
		}
	}
	p := slowPast(rand.New(rand.NewPCG(1, 5)), 500, wild(480, 500))
	end := p.Dates[499] + 2
	flag := func(kind rules.Kind, date rules.Date, s rules.Standing) func(rules.Kind) *rules.Flag {
		return func(k rules.Kind) *rules.Flag {
			if k != kind {
				return nil
			}
			return &rules.Flag{Kind: k, Date: date, Standing: s}
		}
	}
	has := func(found []rules.SlowFinding) bool {
		return slices.ContainsFunc(found, func(f rules.SlowFinding) bool { return f.Kind == rules.KindVolatility })
	}
	week := p.Dates[494] // the Friday before: wild already
	for _, c := range []struct {
		name string
		told func(rules.Kind) *rules.Flag
		want bool
	}{
		{"no flag", func(rules.Kind) *rules.Flag { return nil }, true},
		{"open", flag(rules.KindVolatility, week-300, rules.Open), false},
		{"waived", flag(rules.KindVolatility, week-300, rules.Waived), false},
		{"decided in this spell", flag(rules.KindVolatility, week, rules.Decided), false},
		{"decided in one before", flag(rules.KindVolatility, week-120, rules.Decided), true},
		{"signed off in one before", flag(rules.KindVolatility, week-120, rules.SignedOff), true},
		{"another kind", flag(rules.KindDrift, week, rules.Open), true},
	} {
		if got := has(p.News(end, c.told)); got != c.want {
			t.Errorf("%s: news %t, expected %t", c.name, got, c.want)
		}
	}
}

// A drift that is on its way back within its line is no news, though its spell goes on.
func TestSlowNewsNotWhenFading(t *testing.T) {
	back := 0
	for seed := range uint64(40) {
		p := slowPast(rand.New(rand.NewPCG(seed, 7)), 500, func(at int, m, e float64) (float64, float64) {
			if at >= 440 && at < 470 {
				e += 0.002
			}
			return m, e
		})
		end := p.Dates[499] + 2
		for _, f := range p.Findings(end) {
			if f.Kind != rules.KindDrift || !f.Fading {
				continue
			}
			back++
			for _, n := range p.News(end, func(rules.Kind) *rules.Flag { return nil }) {
				if n.Kind == rules.KindDrift {
					t.Errorf("seed %d: %s is news", seed, n.Note)
				}
			}
		}
	}
	if back == 0 {
		t.Error("none of 40 drifts is on its way back: nothing was tested")
	}
}

// Findings depend on nothing after their date, and no series is too short, too flat or too odd for them.
func TestSlowFindingsLookBackOnly(t *testing.T) {
	for seed := range uint64(50) {
		random := rand.New(rand.NewPCG(seed, 6))
		p := slowPast(random, 1+random.IntN(500), func(at int, m, e float64) (float64, float64) {
			switch seed % 5 {
			case 0:
				return 0, 0
			case 1:
				return m, float64(at%2) * 1e6
			}
			return m, e
		})
		at := random.IntN(len(p.Dates))
		cut := rules.SlowPast{Dates: p.Dates[:at+1], Returns: p.Returns[:at+1], Residuals: p.Residuals[:at+1]}
		if a, b := p.Findings(p.Dates[at]), cut.Findings(p.Dates[at]); !slices.Equal(a, b) {
			t.Fatalf("seed %d: %v, alone %v", seed, a, b)
		}
	}
}

func BenchmarkSlowFindings(b *testing.B) {
	p := slowPast(rand.New(rand.NewPCG(1, 8)), 265, func(_ int, m, e float64) (float64, float64) { return m, e })
	p.Residuals = nil
	b.ReportAllocs()
	for b.Loop() {
		p.Findings(p.Dates[264])
	}
}
