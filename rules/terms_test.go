package rules_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"strayd/rules"
)

// Twenty values of 0 and 2 % in turn: mean 1 %, deviation 1 % x sqrt(20/19). With the factor sqrt(21/20) a value over k days lies
// (x - k 1 %) / (1 % x sqrt(k 21/19)) deviations out: the sum of k independent returns has k times the mean and the variance.
func TestValueOverSeveralDays(t *testing.T) {
	var bp []float64
	for range 10 {
		bp = append(bp, 0, 200)
	}
	for _, c := range []struct {
		days int
		x    float64
	}{{0, 0.02}, {1, 0.02}, {2, 0.02}, {3, 0.03}, {3, 0.07}, {3, -0.06}, {5, 0.2}, {21, 0.21}, {366, 1}} {
		k := float64(max(c.days, 1))
		p := past(bp...)
		p.Days = c.days
		v := gauge(t, nil).Judge(rules.Units(math.Round(c.x*1e15)), p)
		unit := 0.01 * math.Sqrt(k*21/19)
		want := (c.x - k*0.01) / unit
		if math.Abs(v.Z.V-want) > 1e-12*max(1, math.Abs(want)) {
			t.Errorf("%g over %d days: z %v, want %v", c.x, c.days, v.Z.V, want)
		}
		// 5.51 is the two-sided 99.73 % point of Student's t with 5 degrees of freedom: JCGM 100:2008 (GUM), table G.2. The range scales
		// it to unit variance.
		if high := k*0.01 + 5.51*math.Sqrt(0.6)*unit; math.Abs(v.High.V-high) > 0.005*unit {
			t.Errorf("%g over %d days: high %v, want %v", c.x, c.days, v.High.V, high)
		}
		if v.Mean.V != 0.01 || math.Abs(v.Deviation.V-0.01*math.Sqrt(20.0/19)) > 1e-15 {
			t.Errorf("mean %v and deviation %v are not those of one day", v.Mean.V, v.Deviation.V)
		}
		if words := (rules.Terms{Days: c.days}).Covers(); v.Why != words || (words == "") != (c.days < 2) {
			t.Errorf("%d days: why %q, want %q", c.days, v.Why, words)
		}
	}
}

// Under every scale and tail, the verdict agrees with the lines, and x over four days is as far out as m + (x - 4m)/2 is over one.
func TestSpansAgreeWithTheirLines(t *testing.T) {
	changes := map[string]func(*rules.Range){
		"plain": nil, "normal": func(r *rules.Range) { r.Tail.Name = "normal" }, "lower": func(r *rules.Range) { r.Side = rules.Lower },
		"predictive-t": func(r *rules.Range) { r.Tail.Name = "predictive-t" }, "mad": func(r *rules.Range) { r.Scale = rules.MAD },
		"weighted": func(r *rules.Range) { r.Scale = rules.Weighted },
		"rank": func(r *rules.Range) {
			r.Tail.Name, r.Watch.Tail, r.Breach.Tail = "rank", 0.2, 0.1
		},
	}
	const seed = 41
	t.Logf("seed %d", seed)
	random := rand.New(rand.NewPCG(seed, 1))
	for name, change := range changes {
		g := gauge(t, change)
		for range 300 {
			bp := make([]float64, 20+random.IntN(40))
			for i := range bp {
				bp[i] = math.Round(30 + 100*random.NormFloat64())
			}
			p := past(bp...)
			p.Days = 4
			x := rules.Units(math.Round(4*random.NormFloat64()*100)) * 100_000_000_000
			v := g.Judge(x, p)
			out := v.Low.OK && x.Float() < v.Low.V || v.High.OK && x.Float() > v.High.V
			if near := v.Low.OK && math.Abs(x.Float()-v.Low.V) < 1e-12 || v.High.OK && math.Abs(x.Float()-v.High.V) < 1e-12; !near &&
				out != (v.Finding == rules.Breach) {
				t.Fatalf("%s: %v is %s between %v and %v", name, x, v.Finding, v.Low, v.High)
			}
			p.Days = 1
			one := g.Judge(rules.Units(math.Round((v.Mean.V+(x.Float()-4*v.Mean.V)/2)*1e15)), p)
			if math.Abs(one.Z.V-v.Z.V) > 1e-9*max(1, math.Abs(v.Z.V)) || one.Finding != v.Finding || math.Abs(one.Tail.V-v.Tail.V) > 1e-9 {
				t.Fatalf("%s: over four days %+v, its share of one day %+v", name, v, one)
			}
		}
	}
}

func TestTerms(t *testing.T) {
	estimate, final := rules.Terms{Estimate: true}, rules.Terms{}
	for _, c := range []struct {
		before, now rules.Terms
		want        string
	}{
		{final, final, ""},
		{estimate, estimate, ""},
		{rules.Terms{Days: 1}, final, ""},
		{estimate, final, "final after an estimate"},
		{final, estimate, "an estimate after a final value: ask which one stands"},
		{rules.Terms{Days: 3}, final, "covers 1 business day, before 3"},
		{rules.Terms{Estimate: true}, rules.Terms{Days: 2}, "covers 2 business days, before 1; final after an estimate"},
	} {
		if got := c.now.After(c.before); got != c.want {
			t.Errorf("%+v after %+v: %q, want %q", c.now, c.before, got, c.want)
		}
		if back := rules.TermsOf(c.now.Code()); back.Span() != c.now.Span() || back.Estimate != c.now.Estimate {
			t.Errorf("%+v comes back as %+v", c.now, back)
		}
	}
}
