package rules

import (
	"math"
	"slices"
)

// SlowKinds are the kinds of flag that a week's slow-burn checks raise. They belong to the weekly log: no channel is told of them.
var SlowKinds = []Kind{KindDrift, KindVolatility, KindMisfit}

// Slow says whether a kind is one of the slow-burn checks.
func (k Kind) Slow() bool { return slices.Contains(SlowKinds, k) }

// The windows of the slow-burn checks, in observations.
const (
	SlowReach  = 500 // dates that a check looks back at most
	slowLong   = 250
	slowShort  = 60
	SlowLeast  = 120 // fewest that anything is held against (common practice, no source)
	slowNewest = 20
)

// SlowPast is what the slow-burn checks see of one series: its observations by date, as fractions. Residuals are what its reference leaves
// unexplained of each; nil where it has none.
type SlowPast struct {
	Dates     []Date
	Returns   []float64
	Residuals []float64
}

// SlowFinding is what one check found at a date.
type SlowFinding struct {
	Kind Kind
	Up   bool // towards higher values, or a larger deviation
	// Fading says that its spell goes on but that it is back within its limit: no news, though it was some.
	Fading bool
	Note   string
}

// upto is the past up to and including a date.
func (p *SlowPast) upto(end Date) SlowPast {
	n, _ := slices.BinarySearch(p.Dates, end+1)
	out := SlowPast{Dates: p.Dates[:n], Returns: p.Returns[:n]}
	if p.Residuals != nil {
		out.Residuals = p.Residuals[:n]
	}
	return out
}

// judged are the values that drift and volatility go by, and their word.
func (p *SlowPast) judged() ([]float64, string) {
	if p.Residuals != nil {
		return p.Residuals, "residuals"
	}
	return p.Returns, "returns"
}

// Findings are what the checks find as things stood after a date, in the order of SlowKinds.
func (p *SlowPast) Findings(end Date) (out []SlowFinding) {
	then := p.upto(end)
	for _, check := range []func() (SlowFinding, bool){then.drift, then.volatility, then.misfit} {
		if f, found := check(); found {
			out = append(out, f)
		}
	}
	return out
}

// News are the findings after the last date of a week that no flag tells of yet. told is the newest earlier flag of a kind, nil for none. A
// flag stands for its spell: for as long as it asks something or is waived, and while every week's end since finds the same.
func (p *SlowPast) News(end Date, told func(Kind) *Flag) (out []SlowFinding) {
	for _, f := range p.Findings(end) {
		if old := told(f.Kind); !f.Fading && (old == nil || !p.lasts(f, old, end)) {
			out = append(out, f)
		}
	}
	return out
}

func (p *SlowPast) lasts(f SlowFinding, old *Flag, end Date) bool {
	if old.Standing.Asks() || old.Standing == Waived {
		return true
	}
	for at := MondayOf(end) - 1; at >= old.Date && len(p.upto(at).Dates) > SlowLeast+slowShort; at -= 7 {
		if !slices.ContainsFunc(p.Findings(at), func(g SlowFinding) bool { return g.Kind == f.Kind && g.Up == f.Up }) {
			return false
		}
	}
	return true
}

// running gives mean and deviation (divisor n-1) of any stretch of values in a few operations. The values are centred first, so that the
// squares lose nothing that counts beside ScaleFloor.
type running struct {
	centre      float64
	sum, square []float64
}

func newRunning(values []float64) *running {
	r := &running{centre: mean(values), sum: make([]float64, len(values)+1), square: make([]float64, len(values)+1)}
	for i, x := range values {
		d := x - r.centre
		r.sum[i+1], r.square[i+1] = r.sum[i]+d, r.square[i]+float64(d*d)
	}
	return r
}

// of is over the values from one to before another; there are two at least.
func (r *running) of(from, to int) (mean, deviation float64) {
	mean, variance := r.moments(from, to)
	return mean, math.Sqrt(variance)
}

func (r *running) moments(from, to int) (mean, variance float64) {
	n := float64(to - from)
	s := r.sum[to] - r.sum[from]
	variance = (r.square[to] - r.square[from] - float64(s*s)/n) / (n - 1)
	return r.centre + s/n, max(0, variance)
}

func mean(values []float64) float64 {
	s := 0.0
	for _, x := range values {
		s += x
	}
	return s / float64(max(1, len(values)))
}
