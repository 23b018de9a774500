package rules

import (
	"fmt"
	"math"
)

// CUSUM is a two-sided cumulative sum of standardised values (Page 1954, Biometrika 41, 100-115):
//
//	up = max(0, up + z - allowance), down = max(0, down - z - allowance)
//
// with z held within +-clip first, so that single far-out values say little. A side signals beyond the line, and its spell lasts until it is
// back at 0.
type CUSUM struct {
	Allowance, Line, Clip float64
	Up, Down              CUSUMSide
}

// CUSUMSide is one of the sums.
type CUSUMSide struct {
	Sum   float64
	Since int  // steps since it was at 0
	On    bool // it has been beyond the line since
}

// NewCUSUM is the one of `drift`: an allowance of 0.5 and a line of 5 deviations, clipped at 2.5. Its two
// sides together signal once in 465 normal values without the clip (Montgomery, Introduction to Statistical Quality Control) and once in about
// 850 values of the heavy tails of returns with it (Student t, 5 degrees of freedom), where they would in 280 without.
func NewCUSUM() *CUSUM { return &CUSUM{Allowance: 0.5, Line: 5, Clip: 2.5} }

// Step takes one standardised value.
func (c *CUSUM) Step(z float64) {
	z = min(max(z, -c.Clip), c.Clip)
	c.Up.step(z-c.Allowance, c.Line)
	c.Down.step(-z-c.Allowance, c.Line)
}

func (s *CUSUMSide) step(by, line float64) {
	s.Sum, s.Since = s.Sum+by, s.Since+1
	if s.Sum <= 0 {
		*s = CUSUMSide{}
	}
	s.On = s.On || s.Sum > line
}

// drift looks for a small bias that persists: the CUSUM of values standardised by the mean of the up to 250 before each and by the larger of
// their deviation and that of the newest 60 of them, so that a change of scale does not pass for a bias.
func (p *SlowPast) drift() (SlowFinding, bool) {
	values, word := p.judged()
	if len(values) <= SlowLeast {
		return SlowFinding{}, false
	}
	r, c := newRunning(values), NewCUSUM()
	for n := SlowLeast; n < len(values); n++ {
		centre, long := r.moments(max(0, n-slowLong), n)
		_, short := r.moments(n-slowShort, n)
		c.Step((values[n] - centre) / math.Sqrt(max(long, short, ScaleFloor*ScaleFloor)))
	}
	side, way := c.Up, "higher"
	if !side.On || c.Down.On && c.Down.Sum > side.Sum {
		side, way = c.Down, "lower"
	}
	if !side.On {
		return SlowFinding{}, false
	}
	from := len(values) - side.Since
	before, _ := r.of(max(0, from-slowLong), from)
	bias := mean(values[from:]) - before
	return SlowFinding{Kind: KindDrift, Up: way == "higher", Fading: side.Sum <= c.Line, Note: fmt.Sprintf(
		"%s lie %s since %s, by %s bp a day on the mean of %d observations; cumulative sum %.1f (it signals beyond %g, and until it is back at 0)",
		word, way, p.Dates[from], signed(bias*1e4), side.Since, side.Sum, c.Line)}, true
}

func signed(x float64) string {
	if math.Abs(x) >= 10 {
		return fmt.Sprintf("%+.0f", x)
	}
	return fmt.Sprintf("%+.2g", x)
}
