package stats

import "math"

// WeightedPanel holds the exponentially weighted variances of many series side by side, about a mean of zero:
//
//	v = sum(x^2)/n                   over the first window values (and over those there are, before that)
//	v = decay v + (1 - decay) x^2    from then on
//
// The sum is exact; the recursion is in floats, in a fixed order of operations, so that a replay from the first value gives
// the same bits. RiskMetrics Technical Document, 4th edition, 1996, section 5.2, seeded by the first window.
type WeightedPanel struct {
	window     int
	decay, one float64
	cells      []Weighted
}

// Weighted is the whole state of one series of a WeightedPanel.
type Weighted struct {
	N int32   // values taken so far
	V float64 // the variance, where one units make 1; 0 for no values
	Q Uint128 // sum of squares of the first window values
}

// NewWeightedPanel makes a panel of series without values. decay is between 0 and 1; one units make 1; window is from 1 to
// MaxWindow.
func NewWeightedPanel(series, window int, decay, one float64) *WeightedPanel {
	checkWindow(window)
	return &WeightedPanel{window, decay, one, make([]Weighted, series)}
}

// Reset empties every series and keeps the memory.
func (p *WeightedPanel) Reset() { clear(p.cells) }

// Clear empties series i.
func (p *WeightedPanel) Clear(i int) { p.cells[i] = Weighted{} }

// N is how many values series i has taken, all of which bear on its variance.
func (p *WeightedPanel) N(i int) int { return int(p.cells[i].N) }

// State is the state of series i, and SetState puts it back.
func (p *WeightedPanel) State(i int) Weighted { return p.cells[i] }

// SetState makes w the state of series i.
func (p *WeightedPanel) SetState(i int, w Weighted) { p.cells[i] = w }

// Deviation is the square root of the variance of series i. ok is false without values.
func (p *WeightedPanel) Deviation(i int) (deviation float64, ok bool) {
	return math.Sqrt(p.cells[i].V), p.cells[i].N > 0
}

// Push takes every present value into its series. The caller has seen to it that no value is beyond MaxValue.
func (p *WeightedPanel) Push(vals []int64) {
	keep, add := p.decay, 1-p.decay
	for i, k := range vals {
		if k == Missing {
			continue
		}
		c := &p.cells[i]
		if int(c.N) < p.window {
			p.seed(c, k)
			continue
		}
		x := float64(k) / p.one
		c.V = float64(keep*c.V) + float64(float64(add*x)*x)
		if c.N < math.MaxInt32 {
			c.N++
		}
	}
}

func (p *WeightedPanel) seed(c *Weighted, k int64) {
	c.N++
	c.Q = c.Q.add(square(k))
	c.V = c.Q.pair().over(float64(c.N)).over(p.one).over(p.one).float()
}

// Scan appends to cand the index of every present value that is not surely inside: the gate does not hold it, the variance is
// 0, or the value is beyond MaxValue. It changes nothing else.
func (p *WeightedPanel) Scan(vals []int64, gate Gate, cand []int32) []int32 {
	last := int32(len(gate) - 1)
	for i, k := range vals {
		if k == Missing {
			continue
		}
		c := &p.cells[i]
		x := float64(k) / p.one
		inside := float64(x*x) < float64(gate[min(c.N, last)]*c.V)
		if !inside || uint64(k+MaxValue) > 2*MaxValue {
			cand = append(cand, int32(i))
		}
	}
	return cand
}
