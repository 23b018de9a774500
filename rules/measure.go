package rules

import (
	"fmt"
	"math"

	"strayd/stats"
)

// measure is the yardstick that a past gives: centre, spread, tail and lines, with the verdict as far as it stands without the
// observation.
type measure struct {
	verdict Verdict
	scored  bool // a z-score can be had
	spread  float64
	tail    *stats.Tail // nil for rank
	cut     cuts
}

func (g *Gauge) measure(p *Past) (m measure) {
	v := &m.verdict
	v.N = p.N
	v.Mean, v.Deviation = g.estimate(p)
	v.Finding, v.Why = g.standing(p, v)
	v.Why = also(v.Why, Terms{Days: p.Days}.Covers())
	v.Provisional = v.Finding == Inside && p.N < LeastNormal
	if !v.Deviation.OK || v.Deviation.V == 0 || p.N < 2 { // one value gives no degree of freedom
		return m
	}
	m.scored = true
	m.spread = g.spread(p, v)
	if g.Range.Tail.Name == "rank" && p.N >= LeastNormal {
		return m
	}
	if err := g.setTail(&m, p); err != nil {
		m.scored, v.Finding, v.Why = false, NotJudged, err.Error()
		return m
	}
	if v.Finding == Inside {
		v.Lines = g.lines(float64(p.span()*v.Mean.V), m.spread, m.cut)
	}
	return m
}

// also joins two reasons.
func also(a, b string) string {
	if a == "" || b == "" {
		return a + b
	}
	return a + "; " + b
}

// setTail chooses the tail: the range's own, that which it has learnt, or the predictive t while history is thin.
func (g *Gauge) setTail(m *measure, p *Past) error {
	n := p.N
	if t, ok := g.learnt[p.DF]; ok && n >= LeastNormal {
		m.tail, m.cut = &t.tail, t.cut
		return nil
	}
	if n >= LeastNormal && g.Range.Tail.Name != "predictive-t" {
		m.tail, m.cut = &g.tail, g.cut
		return nil
	}
	t, err := g.thinAt(n)
	if err != nil {
		return err
	}
	m.tail, m.cut = &t.tail, t.cut
	return nil
}

// standing says whether a past is enough to judge by, and why not.
func (g *Gauge) standing(p *Past, v *Verdict) (Finding, string) {
	switch {
	case p.N == 0 && p.Dormant:
		return NotJudged, fmt.Sprintf("dormant: no used value in the %d business days before; judged again after %d new observations", DormantAfter, LeastJudged)
	case p.N < LeastJudged:
		return NotJudged, fmt.Sprintf("have %d observations, need %d; judged once there are %d", p.N, LeastJudged, LeastJudged)
	case v.Deviation.V == 0:
		return NotJudged, fmt.Sprintf("deviation is 0 over %d observations; judged again once a value differs", p.N)
	case p.N < LeastNormal:
		return Inside, fmt.Sprintf("provisional: have %d observations, need %d", p.N, LeastNormal)
	}
	return Inside, ""
}

// estimate gives centre and deviation as the range's scale defines them.
func (g *Gauge) estimate(p *Past) (mean, deviation Num) {
	if p.N == 0 {
		return Num{}, Num{}
	}
	switch g.Range.Scale {
	case Weighted: // zero mean by definition
		return Some(0), Some(math.Sqrt(p.Var))
	case MAD:
		sorted := p.Sorted()
		median, _ := sorted.Median(one)
		mad, _ := sorted.MAD(one)
		return Some(median), Some(stats.NormalMAD * mad)
	}
	mean = Some(p.Sums.Mean(one))
	if d, ok := p.Sums.Deviation(one); ok {
		deviation = Some(d)
	}
	return mean, deviation
}

// distance is how far a return lies from the centre, for one over k business days from k times the centre.
func (g *Gauge) distance(p *Past, x Units) float64 {
	if p.Days > 1 {
		center, _ := g.estimate(p)
		return x.Float() - float64(p.span()*center.V)
	}
	switch g.Range.Scale {
	case Weighted:
		return x.Float()
	case MAD:
		return p.Sorted().Distance(int64(x), one)
	}
	return p.Sums.Distance(int64(x), one)
}

// spread is the deviation that a z-score divides by:
//
//	max(sqrt(k) deviation, floor, sqrt(k) group's deviation while provisional) x sqrt(1 + 1/n)
//
// for a value over k business days (the floors are about how values are written, whatever they cover), with the last factor for a new observation (predictive) on the plain scale, and always while the tail is a predictive t.
func (g *Gauge) spread(p *Past, v *Verdict) float64 {
	s := v.Deviation.V
	thin := p.N < LeastNormal
	if thin && p.Group.OK {
		s = max(s, p.Group.V)
	}
	s = max(math.Sqrt(p.span())*s, ScaleFloor)
	if tick := tickFloor(p, s); tick > s {
		s = tick
	}
	if thin || g.Range.Tail.Name == "predictive-t" || g.Range.Predictive && g.Range.Scale == Plain {
		s *= math.Sqrt(1 + 1/float64(p.N))
	}
	return s
}

// tickFloor is the deviation of rounding alone, tick/sqrt(12), where the tick is the finest decimal step that the window shows;
// 0 when that is no more than least. A value rounded to steps of h has an error of variance h^2/12 (Sheppard's correction).
func tickFloor(p *Past, least float64) float64 {
	step := int64(1)
	for rounding(step) <= least {
		if step *= 10; step > int64(WindowLimit) {
			return 0
		}
	}
	if p.Values == nil { // weighted: the window is not kept
		return 0
	}
	values := p.Values()
	for divides(step, values) {
		if step *= 10; step > int64(WindowLimit) {
			return 0
		}
	}
	if step /= 10; rounding(step) <= least {
		return 0
	}
	return rounding(step)
}

func rounding(step int64) float64 { return float64(step) / one / math.Sqrt(12) }

func divides(step int64, values []int64) bool {
	for _, k := range values {
		if k%step != 0 {
			return false
		}
	}
	return true
}

func (g *Gauge) lines(center, spread float64, c cuts) (l Lines) {
	if g.Range.Side != Upper {
		l.WatchLow, l.Low = Some(center-float64(c.watch*spread)), Some(center-float64(c.breach*spread))
	}
	if g.Range.Side != Lower {
		l.WatchHigh, l.High = Some(center+float64(c.watch*spread)), Some(center+float64(c.breach*spread))
	}
	return l
}

// judgeRank judges by the rank of the return in its window; one over several business days by the rank of what it comes to a day.
func (g *Gauge) judgeRank(v *Verdict, x Units, p *Past) {
	sorted := p.Sorted()
	if p.Days > 1 {
		x = daily(x, v.Mean.V, p.span())
		defer func() { v.Lines = v.Lines.over(v.Mean.V, p.span()) }()
	}
	atMost, atLeast := sorted.Ranks(int64(x))
	tail := stats.RankTail(atMost, atLeast, len(sorted))
	switch g.Range.Side {
	case Lower:
		tail = stats.RankLower(atMost, len(sorted))
	case Upper:
		tail = stats.RankUpper(atLeast, len(sorted))
	}
	v.Tail, v.Log10 = Some(tail), Some(math.Log10(tail))
	g.rankLines(v, sorted)
	switch {
	case v.Finding != Inside:
	case outside(x, v.Low, v.High):
		v.Finding = Breach
	case outside(x, v.WatchLow, v.WatchHigh):
		v.Finding = Watch
	}
}

func outside(x Units, low, high Num) bool {
	return low.OK && x.Float() < low.V || high.OK && x.Float() > high.V
}

// rankLines draws the lines as order statistics of the window, or says how many observations the breach line needs.
func (g *Gauge) rankLines(v *Verdict, sorted stats.Sorted) {
	if v.Finding == NotJudged {
		return
	}
	level := g.Range.Breach.Probability()
	var ok bool
	if v.Low, v.High, ok = g.rankLine(sorted, level); !ok {
		v.Finding = NotJudged
		v.Why = fmt.Sprintf("have %d observations, need %d for a rank line of %.4g %%", len(sorted), g.rankNeeds(level), 100*level)
		return
	}
	v.WatchLow, v.WatchHigh, _ = g.rankLine(sorted, g.Range.Watch.Probability())
}

// rankNeeds is the fewest observations at which a rank line of this level can be drawn: the floor of the tail is 2/(n+1), or
// 1/(n+1) one-sided.
func (g *Gauge) rankNeeds(level float64) int {
	n := max(int(1/level)-1, 1)
	for {
		if _, ok := stats.RankMark(level, n, g.side()); ok {
			return n
		}
		n++
	}
}

func (g *Gauge) rankLine(sorted stats.Sorted, level float64) (low, high Num, ok bool) {
	mark, ok := stats.RankMark(level, len(sorted), g.side())
	if !ok {
		return low, high, false
	}
	l, h, ok := sorted.Lines(mark)
	if ok && g.Range.Side != Upper {
		low = Some(Units(l).Float())
	}
	if ok && g.Range.Side != Lower {
		high = Some(Units(h).Float())
	}
	return low, high, ok
}
