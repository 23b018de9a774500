package rules_test

import (
	"math"
	"slices"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/stats"
)

// own is a range as the configuration's defaults make it.
func own(change func(*rules.Range)) rules.Range {
	r := rules.Range{Name: "own", Of: rules.Return, Window: 60, Scale: rules.Plain, Decay: 0.94, Tail: rules.TailModel{Name: "t", DF: 5},
		Predictive: true, Side: rules.Both, Watch: rules.Line{Tail: 0.01}, Breach: rules.Line{Tail: 0.0027}, Pending: rules.Clip}
	if change != nil {
		change(&r)
	}
	return r
}

func gauge(t *testing.T, change func(*rules.Range)) *rules.Gauge {
	t.Helper()
	g, err := rules.NewGauge(own(change))
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// past is a window of values in basis points.
func past(bp ...float64) *rules.Past {
	p := &rules.Past{N: len(bp)}
	var values []int64
	for _, v := range bp {
		k := int64(math.Round(v * 1e11))
		values = append(values, k)
		p.Sums.Add(k)
		p.Var += v * v * 1e-8 / float64(len(bp))
	}
	p.Values = func() []int64 { return slices.Clone(values) }
	p.Sorted = func() stats.Sorted { return stats.SortedOf(values) }
	return p
}

// swing is n values of alternating sign and the given size in basis points, the odd one 0, so that the mean is 0 and the deviation
// size x sqrt(m/(n-1)) for the m values that are not 0.
func swing(n int, size float64) (p *rules.Past, deviation float64) {
	bp := make([]float64, n)
	for i := range n / 2 * 2 {
		bp[i] = size
		if i%2 == 1 {
			bp[i] = -size
		}
	}
	return past(bp...), size * 1e-4 * math.Sqrt(float64(n/2*2)/float64(n-1))
}

func near(t *testing.T, what string, got rules.Num, want, rel float64) {
	t.Helper()
	if !got.OK || math.Abs(got.V-want) > rel*math.Abs(want) {
		t.Errorf("%s is %v, want %v", what, got, want)
	}
}

func bp(v float64) rules.Units { return rules.Units(math.Round(v * 1e11)) }

// The factors that PRACTICE.md, section 3.3, quotes for a provisional 99 % line: t(n-1) sqrt(1 + 1/n).
func TestProvisionalFactors(t *testing.T) {
	for _, c := range []struct {
		n      int
		factor float64
	}{{5, 5.04}, {10, 3.41}, {19, 2.95}} {
		g := gauge(t, func(r *rules.Range) { r.Breach = rules.Line{Tail: 0.01}; r.Watch = rules.Line{Tail: 0.05} })
		p, deviation := swing(c.n, 100)
		v := g.Judge(0, p)
		if got := v.High.V / deviation; math.Abs(got-c.factor) > 0.006 || !v.Provisional || !strings.HasPrefix(v.Why, "provisional: have ") {
			t.Errorf("n = %d: the line lies at %.4f deviations, want %.2f; %q", c.n, got, c.factor, v.Why)
		}
	}
	// 2.93 at 20: no longer provisional, so that only the predictive t still gives it
	g := gauge(t, func(r *rules.Range) {
		r.Tail = rules.TailModel{Name: "predictive-t"}
		r.Breach = rules.Line{Confidence: 0.99}
	})
	p, deviation := swing(20, 100)
	if v := g.Judge(0, p); math.Abs(v.High.V/deviation-2.93) > 0.006 || v.Provisional || v.Why != "" {
		t.Errorf("n = 20: the line lies at %.4f deviations, want 2.93; %q", v.High.V/deviation, v.Why)
	}
}

// A provisional verdict uses at least the group's deviation; a full one does not.
func TestGroupDeviation(t *testing.T) {
	g := gauge(t, nil)
	for _, c := range []struct {
		n     int
		group rules.Num
		wider bool
	}{{10, rules.Some(0.05), true}, {10, rules.Some(0.0001), false}, {10, rules.Num{}, false}, {19, rules.Some(0.05), true}, {20, rules.Some(0.05), false}} {
		p, deviation := swing(c.n, 100)
		p.Group = c.group
		v := g.Judge(bp(100), p)
		spread := deviation
		if c.wider {
			spread = 0.05
		}
		near(t, "z", v.Z, 0.01/(spread*math.Sqrt(1+1/float64(c.n))), 1e-14)
		near(t, "deviation", v.Deviation, deviation, 1e-14) // as it is, before floor and group
	}
}

// Too little to judge by: the reason and its cure.
func TestNotJudged(t *testing.T) {
	g := gauge(t, nil)
	constant := past(slices.Repeat([]float64{7}, 30)...)
	for _, c := range []struct {
		g    *rules.Gauge
		p    *rules.Past
		why  string
		z    bool
		line bool
	}{
		{g, past(), "have 0 observations, need 5; judged once there are 5", false, false},
		{g, past(1), "have 1 observations, need 5", false, false},
		{g, past(1, 2, 3, 4), "have 4 observations, need 5", true, false},
		{g, &rules.Past{Dormant: true}, "dormant: no used value in the 20 business days before; judged again after 5 new observations", false, false},
		{g, constant, "deviation is 0 over 30 observations; judged again once a value differs", false, false},
	} {
		v := c.g.Judge(bp(5000), c.p)
		if v.Finding != rules.NotJudged || !strings.HasPrefix(v.Why, c.why) || v.Provisional {
			t.Errorf("%q: %s, %q", c.why, v.Finding, v.Why)
		}
		if v.Z.OK != c.z || v.Tail.OK != c.z || v.Log10.OK != c.z || v.Low.OK || v.WatchHigh.OK {
			t.Errorf("%q: z %v, tail %v, lines %v", c.why, v.Z, v.Tail, v.Lines)
		}
		if e := c.g.Expect(c.p); e.Finding != rules.NotJudged || e.Why != v.Why || e.Low.OK {
			t.Errorf("%q: expects %s, %q, %v", c.why, e.Finding, e.Why, e.Lines)
		}
	}
	for _, scale := range []rules.Scale{rules.Plain, rules.Weighted, rules.MAD} {
		g := gauge(t, func(r *rules.Range) { r.Scale = scale })
		for n := range 6 {
			p, _ := swing(n, 100)
			v := g.Judge(bp(1), p)
			for name, f := range map[string]rules.Num{"mean": v.Mean, "deviation": v.Deviation, "z": v.Z, "tail": v.Tail, "log10": v.Log10} {
				if math.IsNaN(f.V) || math.IsInf(f.V, 0) || !f.OK && f.V != 0 {
					t.Errorf("scale %s, n = %d: %s is %v", scale, n, name, f)
				}
			}
			if n < 5 && (v.Finding != rules.NotJudged || !strings.HasPrefix(v.Why, "have ")) {
				t.Errorf("scale %s, n = %d: %s, %q", scale, n, v.Finding, v.Why)
			}
		}
	}
}

// The scale floor is half a basis point, and tick/sqrt(12) where the window shows a coarser decimal step (PRACTICE.md, 3.3).
func TestScaleFloor(t *testing.T) {
	for _, c := range []struct {
		what string
		bp   []float64
		want float64 // what z divides by, before the predictive factor
	}{
		{"under half a basis point", slices.Repeat([]float64{0.1234567, -0.1234567}, 15), 0.5e-4},
		{"two-decimal per cent, step 1 bp, mostly zeros", append(slices.Repeat([]float64{0}, 29), 1), 0.5e-4}, // 1e-4/sqrt(12) = 0.29e-4 is less
		{"one-decimal per cent, step 10 bp", append(slices.Repeat([]float64{0}, 59), 10), 1e-3 / math.Sqrt(12)},
		{"whole per cent, step 100 bp", append(slices.Repeat([]float64{100}, 59), 200), 1e-2 / math.Sqrt(12)},
		{"a step finer than its deviation", slices.Repeat([]float64{100, -100}, 15), 0.01 * math.Sqrt(30.0/29)},
	} {
		g := gauge(t, func(r *rules.Range) { r.Predictive = false })
		p := past(c.bp...)
		x := bp(12345)
		v := g.Judge(x, p)
		near(t, c.what, v.Z, (x.Float()-v.Mean.V)/c.want, 1e-12)
	}
	// the weighted scale keeps no window, and so has no tick
	g := gauge(t, func(r *rules.Range) { r.Scale = rules.Weighted })
	if v := g.Judge(bp(1), &rules.Past{N: 30, Var: 1e-12}); math.Abs(v.Z.V-2) > 1e-12 {
		t.Errorf("weighted under the floor: z is %v, want 2", v.Z)
	}
}

// Sides: tail and line are both one-sided, and the other side is never beyond.
func TestSides(t *testing.T) {
	p, deviation := swing(40, 100)
	spread := deviation * math.Sqrt(1+1.0/40)
	for _, c := range []struct {
		side            rules.Side
		line            float64 // standard normal quantiles at 1 % (breach) two-sided and one-sided, common tables
		up, down        rules.Finding
		tailUp          float64 // of z = +3: 0.00134989803 one-sided, tables
		hasLow, hasHigh bool
	}{
		{rules.Both, 2.5758293035489004, rules.Breach, rules.Breach, 2 * 0.0013498980316300933, true, true},
		{rules.Lower, 2.3263478740408408, rules.Inside, rules.Breach, 1 - 0.0013498980316300933, true, false},
		{rules.Upper, 2.3263478740408408, rules.Breach, rules.Inside, 0.0013498980316300933, false, true},
	} {
		g := gauge(t, func(r *rules.Range) {
			r.Side, r.Tail, r.Watch, r.Breach = c.side, rules.TailModel{Name: "normal"}, rules.Line{Tail: 0.05}, rules.Line{Tail: 0.01}
		})
		up, down := g.Judge(rules.Units(3*spread*1e15), p), g.Judge(rules.Units(-3*spread*1e15), p)
		if up.Finding != c.up || down.Finding != c.down {
			t.Errorf("side %s: %s above, %s below", c.side, up.Finding, down.Finding)
		}
		near(t, "tail above, side "+string(c.side), up.Tail, c.tailUp, 1e-12)
		if up.Low.OK != c.hasLow || up.WatchLow.OK != c.hasLow || up.High.OK != c.hasHigh || up.WatchHigh.OK != c.hasHigh {
			t.Errorf("side %s has the lines %v", c.side, up.Lines)
		}
		if c.hasHigh {
			near(t, "high, side "+string(c.side), up.High, c.line*spread, 1e-12)
		}
		if c.hasLow {
			near(t, "low, side "+string(c.side), up.Low, -c.line*spread, 1e-12)
		}
	}
}

// One line in its four forms is one line; what it means in the others is said.
func TestLinesInAllForms(t *testing.T) {
	p, deviation := swing(40, 100)
	spread := deviation * math.Sqrt(1+1.0/40)
	want := 2.5758293035489004 * spread // normal, 1 % two-sided
	for name, l := range map[string]rules.Line{"tail": {Tail: 0.01}, "confidence": {Confidence: 0.99}, "z": {Z: 2.5758293035489004},
		"budget": {Budget: 2, Level: 0.01}} {
		g := gauge(t, func(r *rules.Range) { r.Tail, r.Breach = rules.TailModel{Name: "normal"}, l })
		near(t, "high by "+name, g.Expect(p).High, want, 1e-12)
		f, ok := g.Forms(l)
		if !ok || math.Abs(f.Tail-0.01) > 1e-12 || math.Abs(f.Confidence-0.99) > 1e-12 || math.Abs(f.Z-2.5758293035489004) > 1e-12 || math.Abs(f.Days-100) > 1e-10 {
			t.Errorf("%s means %+v, %v", name, f, ok)
		}
	}
	if _, ok := gauge(t, nil).Forms(rules.Line{Budget: 2}); ok {
		t.Error("a budget without its level has forms")
	}
	for _, l := range []rules.Line{{}, {Tail: 1.5}, {Tail: -1}, {Tail: math.NaN()}} {
		if g, err := rules.NewGauge(own(func(r *rules.Range) { r.Breach = l })); err == nil {
			t.Errorf("the line %+v is taken: %v", l, g.Expect(p).Lines)
		} else if !strings.Contains(err.Error(), "range own: breach: ") {
			t.Errorf("the line %+v: %v", l, err)
		}
	}
}

// PRACTICE.md, section 3.3: under t5, a tail of 1 % begins at about 3.1 and 0.27 % at about 4.3 deviations; 3 is once in 85 days.
func TestDefaultLines(t *testing.T) {
	g := gauge(t, nil)
	for _, c := range []struct {
		line rules.Line
		z    float64
		days float64
	}{{rules.Line{Tail: 0.01}, 3.1, 100}, {rules.Line{Tail: 0.0027}, 4.3, 370}, {rules.Line{Z: 3}, 3, 85}, {rules.Line{Z: 4}, 4, 280}, {rules.Line{Z: 2}, 2, 20}} {
		f, ok := g.Forms(c.line)
		if !ok || math.Abs(f.Z-c.z) > 0.05 || math.Abs(f.Days/c.days-1) > 0.02 {
			t.Errorf("%+v means %+v, want about z %v, once in %v days", c.line, f, c.z, c.days)
		}
	}
}

// Rank: twice the smaller of (n_le + 1)/(n + 1) and (n_ge + 1)/(n + 1), at most 1; lines are order statistics; under the floor of
// 2/(n + 1) there is no line, and the reason says from when on.
func TestRank(t *testing.T) {
	values := make([]float64, 99)
	for i := range values {
		values[i] = float64(i - 49)
	}
	p := past(values...)
	ranked := func(breach float64, side rules.Side) *rules.Gauge {
		return gauge(t, func(r *rules.Range) {
			r.Tail, r.Breach, r.Watch, r.Side = rules.TailModel{Name: "rank"}, rules.Line{Tail: breach}, rules.Line{Tail: 0.2}, side
		})
	}
	for _, c := range []struct {
		x    float64
		tail float64
		want rules.Finding
	}{
		{1000, 2.0 / 100, rules.Breach},   // above all 99
		{49.5, 2.0 / 100, rules.Breach},   // just above
		{49, 4.0 / 100, rules.Watch},      // equal to the largest: n_ge = 1
		{48.5, 4.0 / 100, rules.Watch},    // only one above
		{40, 22.0 / 100, rules.Inside},    // n_ge = 10
		{40.5, 20.0 / 100, rules.Watch},   // n_ge = 9, on the line of 20 % exactly: beyond the tenth
		{0, 1, rules.Inside},              // the middle, at most 1
		{-49, 4.0 / 100, rules.Watch},     // equal to the smallest
		{-49.01, 2.0 / 100, rules.Breach}, // below all
	} {
		v := ranked(0.02, rules.Both).Judge(bp(c.x), p)
		near(t, "rank tail", v.Tail, c.tail, 1e-15)
		near(t, "log10", v.Log10, math.Log10(c.tail), 1e-14)
		if v.Finding != c.want {
			t.Errorf("%v is %s, want %s", c.x, v.Finding, c.want)
		}
		near(t, "low", v.Low, -49e-4, 1e-15)
		near(t, "high", v.High, 49e-4, 1e-15)
		near(t, "watch low", v.WatchLow, -40e-4, 1e-15)
	}
	lower := ranked(0.01, rules.Lower).Judge(bp(-50), p)
	near(t, "one-sided tail", lower.Tail, 1.0/100, 1e-15)
	if lower.Finding != rules.Breach || lower.High.OK {
		t.Errorf("below all, lower side: %s, %v", lower.Finding, lower.Lines)
	}
	under := ranked(0.019, rules.Both).Judge(bp(1000), p)
	if under.Finding != rules.NotJudged || !under.Tail.OK || !under.Z.OK || under.Low.OK || under.Why != "have 99 observations, need 105 for a rank line of 1.9 %" {
		t.Errorf("under the floor: %s, %q, %v", under.Finding, under.Why, under.Lines) // 2/(n+1) <= 1.9 % from n = 105 on
	}
}

// A limit is a breach beyond either line, nothing estimated; on the line is inside.
func TestLimit(t *testing.T) {
	g := gauge(t, func(r *rules.Range) { r.Limit = &rules.Limit{Low: -bp(100), High: bp(250)} })
	for x, want := range map[rules.Units]rules.Finding{0: rules.Inside, -bp(100): rules.Inside, -bp(100) - 1: rules.Breach, bp(250): rules.Inside, bp(250) + 1: rules.Breach} {
		if v := g.Judge(x, nil); v.Finding != want || v.Z.OK || v.Mean.OK || v.N != 0 || v.Low.V != -0.01 || v.High.V != 0.025 {
			t.Errorf("%s: %+v", x, v)
		}
	}
	if v := g.Expect(nil); v.Finding != rules.Inside || v.High.V != 0.025 {
		t.Errorf("expects %+v", v)
	}
	if _, ok := g.Gate(true); ok {
		t.Error("a limit has a gate")
	}
}

// auto is t5 until its degrees of freedom are learnt.
func TestAutoBeginsAsT5(t *testing.T) {
	p, _ := swing(40, 100)
	a := gauge(t, func(r *rules.Range) { r.Tail = rules.TailModel{Name: "auto"} }).Judge(bp(400), p)
	b := gauge(t, nil).Judge(bp(400), p)
	if a != b {
		t.Errorf("auto gives %+v, t5 %+v", a, b)
	}
}
