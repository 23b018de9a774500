package rules

import (
	"fmt"
	"math"
	"sync"

	"strayd/stats"
)

const (
	// LeastJudged is the fewest observations that are judged at all.
	LeastJudged = 5
	// LeastNormal is the fewest observations for a verdict that is not provisional.
	LeastNormal = 20
	// DormantAfter is how many business days old the newest used value may be.
	DormantAfter = 20
	// ScaleFloor is the smallest deviation that a z-score divides by: half a basis point.
	ScaleFloor = 0.5e-4

	one = float64(One)
)

// Gauge is a range made ready for judging. It is safe for concurrent use.
type Gauge struct {
	Range Range
	tail  stats.Tail // of a verdict with enough history; unused by rank and predictive-t
	cut   cuts       // of that tail

	mu   sync.Mutex
	thin map[int]thinTail // raw t with n-1 degrees of freedom, by n

	learnt map[float64]thinTail // of auto, by degrees of freedom; only read
}

// cuts are the z-scores at which watch and breach begin, positive.
type cuts struct{ watch, breach float64 }

type thinTail struct {
	tail stats.Tail
	cut  cuts
}

// Past is what is known of a series before the observation that is judged.
type Past struct {
	N       int                 // used observations behind the estimate
	Sums    stats.Sums          // plain and rank: of the window
	Var     float64             // weighted: the mean square, in fractions squared
	Values  func() []int64      // used values of the window, in any order; nil for weighted
	Sorted  func() stats.Sorted // the same, ascending
	Group   Num                 // the group's deviation, for provisional verdicts
	Dormant bool                // the newest used value was too old, so that the window starts anew
	Days    int                 // business days that the value to be judged covers; 0 and 1 are one
	DF      float64             // learnt of the group, for auto; 0 for t5
}

// NewGauge prepares a range. A budget line must have its Level. Errors name the range and the line.
func NewGauge(r Range) (*Gauge, error) {
	g := &Gauge{Range: r, thin: map[int]thinTail{}}
	if r.Limit != nil {
		return g, nil
	}
	var err error
	switch r.Tail.Name {
	case "normal":
		g.tail = stats.Normal()
	case "t":
		g.tail, err = stats.ScaledT(r.Tail.DF)
	default: // auto is t5 until it has learnt; rank and predictive-t need no fixed tail
		g.tail, err = stats.ScaledT(5)
	}
	if err != nil {
		return nil, fmt.Errorf("range %s: %w", r.Name, err)
	}
	if r.Tail.Name != "rank" {
		g.cut, err = g.cutsUnder(g.tail)
	}
	if r.Tail.Name == Auto && err == nil {
		err = g.prepareLearnt()
	}
	return g, err
}

// prepareLearnt makes every tail that may be learnt.
func (g *Gauge) prepareLearnt() error {
	g.learnt = map[float64]thinTail{}
	for _, df := range learntDF {
		tail := learntTail(df)
		cut, err := g.cutsUnder(tail)
		if err != nil {
			return err
		}
		g.learnt[df] = thinTail{tail, cut}
	}
	return nil
}

func (g *Gauge) cutsUnder(t stats.Tail) (c cuts, err error) {
	if c.watch, err = g.cutAt(t, g.Range.Watch); err != nil {
		return c, fmt.Errorf("range %s: watch: %w", g.Range.Name, err)
	}
	if c.breach, err = g.cutAt(t, g.Range.Breach); err != nil {
		return c, fmt.Errorf("range %s: breach: %w", g.Range.Name, err)
	}
	return c, nil
}

func (g *Gauge) cutAt(t stats.Tail, l Line) (float64, error) {
	if l.Z > 0 {
		return l.Z, nil
	}
	line, err := t.LineOfTail(l.Probability(), g.side())
	return line.Z, err
}

// Forms says one of the range's lines in every way, under its own tail with a full window. ok is false for a budget without its
// level, and for a rank range, where no z stands for a tail.
func (g *Gauge) Forms(l Line) (forms stats.Line, ok bool) {
	t := g.tail
	if g.Range.Tail.Name == "predictive-t" {
		thin, err := g.thinAt(g.Range.Window)
		if err != nil {
			return forms, false
		}
		t = thin.tail
	}
	var err error
	switch p := l.Probability(); {
	case g.Range.Tail.Name == "rank" && p > 0:
		return stats.Line{Tail: p, Confidence: stats.Complement(p), Days: 1 / p}, true
	case l.Z > 0:
		forms, err = t.LineOfZ(l.Z, g.side())
	case p > 0:
		forms, err = t.LineOfTail(p, g.side())
	default:
		return forms, false
	}
	return forms, err == nil
}

// side is how many tails the range's lines cut off.
func (g *Gauge) side() stats.Side {
	if g.Range.Side == Lower || g.Range.Side == Upper {
		return stats.OneSided
	}
	return stats.TwoSided
}

// Probability is the tail probability of a line that states one, directly, as a confidence or as a budget's level; 0 for a line
// stated in deviations.
func (l Line) Probability() float64 {
	switch {
	case l.Tail > 0:
		return l.Tail
	case l.Confidence > 0:
		return stats.Complement(l.Confidence)
	}
	return l.Level
}

// Gate is what a fast scan may rely on: values that it holds are surely inside. With thin, it also holds provisional values; that a
// group would lend them a wider deviation keeps them inside. ok is false when every value must be judged one by one.
func (g *Gauge) Gate(thin bool) (gate stats.Gate, ok bool) {
	r := g.Range
	least := LeastNormal
	if thin {
		least = LeastJudged
	}
	switch {
	case r.Limit != nil, r.Tail.Name == "rank":
		return nil, false
	case r.Scale == Weighted: // it counts on beyond its window
		return stats.WeightedGate(max(r.Window, LeastNormal), least, g.inner), true
	case r.Scale == MAD:
		return stats.MADGate(r.Window, least, g.inner), true
	}
	return stats.PlainGate(r.Window, least, g.inner, r.Predictive || r.Tail.Name == "predictive-t"), true
}

// inner is the inner line for a window of n values, in deviations; 0, which holds nothing, for those of a predictive t that are
// neither thin nor full: to find each would cost more than it saves.
func (g *Gauge) inner(n int) float64 {
	c := g.cut
	if n < LeastNormal || g.Range.Tail.Name == "predictive-t" {
		if n >= LeastNormal && n != g.Range.Window {
			return 0
		}
		t, err := g.thinAt(n)
		if err != nil {
			return 0
		}
		c = t.cut
	}
	least := math.Min(c.watch, c.breach)
	if n >= LeastNormal {
		for _, t := range g.learnt {
			least = min(least, t.cut.watch, t.cut.breach)
		}
	}
	return least
}

// thinAt is the tail of a predictive t with n-1 degrees of freedom and its cuts.
func (g *Gauge) thinAt(n int) (thinTail, error) {
	g.mu.Lock()
	defer g.mu.Unlock()
	if t, ok := g.thin[n]; ok {
		return t, nil
	}
	tail, err := stats.RawT(float64(n - 1))
	if err != nil {
		return thinTail{}, err
	}
	cut, err := g.cutsUnder(tail)
	t := thinTail{tail, cut}
	if err == nil {
		g.thin[n] = t
	}
	return t, err
}

// Judge concludes what a return is under the range, given the past before it. One over k business days is held against k times the mean
// and sqrt(k) times the deviation of one day; mean and deviation of the verdict stay those of one day.
func (g *Gauge) Judge(x Units, p *Past) Verdict {
	if g.Range.Limit != nil {
		return JudgeLimit(g.Range.Limit, x)
	}
	m := g.measure(p)
	v := m.verdict
	if !m.scored {
		return v
	}
	z := g.distance(p, x) / m.spread
	v.Z = Some(z)
	if g.Range.Tail.Name == "rank" && m.tail == nil {
		g.judgeRank(&v, x, p)
		return v
	}
	tail, log10 := g.tailOf(*m.tail, z)
	v.Tail, v.Log10 = Some(tail), Some(log10)
	if v.Finding == Inside {
		v.Finding = g.beyond(z, m.cut)
	}
	return v
}

func (g *Gauge) tailOf(t stats.Tail, z float64) (p, log10 float64) {
	switch g.Range.Side {
	case Lower:
		return t.Upper(-z)
	case Upper:
		return t.Upper(z)
	}
	return t.TwoSided(z)
}

func (g *Gauge) beyond(z float64, c cuts) Finding {
	switch g.Range.Side {
	case Lower:
		z = -z
	case Upper:
	default:
		z = math.Abs(z)
	}
	switch {
	case z > c.breach:
		return Breach
	case z > c.watch:
		return Watch
	}
	return Inside
}

// Expect says what would be in range next, without an observation.
func (g *Gauge) Expect(p *Past) Verdict {
	if g.Range.Limit != nil {
		v := JudgeLimit(g.Range.Limit, 0)
		v.Finding = Inside
		return v
	}
	m := g.measure(p)
	if m.scored && m.tail == nil {
		g.rankLines(&m.verdict, p.Sorted())
	}
	return m.verdict
}
