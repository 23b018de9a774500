package rules

import (
	"math"
	"slices"

	"strayd/stats"
)

// A tail that is learnt, auto, is Student's t scaled to unit variance with the degrees of freedom that the far values of a group speak for, each in
// the deviation that its range gave for it before it came.

// LearntFrom is how many values it takes; fewer leave t5.
const LearntFrom = 250

// learntDF are the degrees of freedom to choose from; infinity is the normal distribution.
var learntDF = []float64{3, 3.5, 4, 5, 6, 8, 12, math.Inf(1)}

// farLines are the distances, in deviations, between which values are counted: where t5 has tails of 1 %, 0.27 % and 0.1 %.
var farLines = [3]float64{3.123, 4.273, 5.332}

// guessed is how many values under t5 count beside those seen: a group of few series must show more to be believed.
const guessed = 2000

// Exceedances counts values by how far they lay out.
type Exceedances struct {
	N      int
	Beyond [3]int // of the lines
}

// Add counts the values of one series under a range, the oldest first, fractions: each against the window before it. Values beyond t5's
// line of 0.27 % enter the window clipped to it.
func (e *Exceedances) Add(r *Range, values []float64) {
	s := &sliding{r: r}
	for _, x := range values {
		mean, deviation, ok := s.yardstick()
		if ok {
			deviation = max(deviation, ScaleFloor)
			z := (x - mean) / deviation
			e.N++
			for k, line := range farLines {
				if math.Abs(z) > line {
					e.Beyond[k]++
				}
			}
			far := float64(farLines[1] * deviation)
			x = min(max(x, mean-far), mean+far)
		}
		s.take(x)
	}
}

// Sum adds the counts of other series.
func (e *Exceedances) Sum(o Exceedances) {
	e.N += o.N
	for k := range e.Beyond {
		e.Beyond[k] += o.Beyond[k]
	}
}

// DF are the likeliest degrees of freedom: of counts that are multinomial over the cells between the lines, beside guessed values of a t5. It
// is 5 while there are too few values.
func (e *Exceedances) DF() float64 {
	if e.N < LearntFrom {
		return 5
	}
	prior := cells(5)
	best, most := 5.0, math.Inf(-1)
	for _, df := range learntDF {
		like := 0.0
		for k, p := range cells(df) {
			like += (e.cell(k) + float64(guessed*prior[k])) * math.Log(p)
		}
		if like > most {
			best, most = df, like
		}
	}
	return best
}

// cell counts the values between two lines, the innermost first.
func (e *Exceedances) cell(k int) float64 {
	inner, outer := e.N, 0
	if k > 0 {
		inner = e.Beyond[k-1]
	}
	if k < len(e.Beyond) {
		outer = e.Beyond[k]
	}
	return float64(inner - outer)
}

// cells are the probabilities of the cells between the lines.
func cells(df float64) (p [len(farLines) + 1]float64) {
	tail := learntTail(df)
	before := 1.0
	for k, line := range farLines {
		beyond, _ := tail.TwoSided(line)
		p[k], before = before-beyond, beyond
	}
	p[len(farLines)] = before
	return p
}

// learntTail is the distribution of learnt degrees of freedom.
func learntTail(df float64) stats.Tail {
	if tail, err := stats.ScaledT(df); err == nil && !math.IsInf(df, 1) {
		return tail
	}
	return stats.Normal()
}

// sliding is the window of one series in fractions: near enough to count by.
type sliding struct {
	r      *Range
	window []float64
	n      int
	v      float64 // weighted
}

func (s *sliding) yardstick() (mean, deviation float64, ok bool) {
	n := len(s.window)
	if n < LeastNormal {
		return 0, 0, false
	}
	switch s.r.Scale {
	case Weighted:
		deviation = math.Sqrt(s.v)
	case MAD:
		mean = medianOf(s.window)
		off := make([]float64, n)
		for i, x := range s.window {
			off[i] = math.Abs(x - mean)
		}
		deviation = stats.NormalMAD * medianOf(off)
	default:
		mean, deviation = newRunning(s.window).of(0, n)
		if s.r.Predictive {
			deviation *= math.Sqrt(1 + 1/float64(n))
		}
	}
	return mean, deviation, deviation > 0
}

func (s *sliding) take(x float64) {
	if s.n++; s.n <= s.r.Window {
		s.v += (float64(x*x) - s.v) / float64(s.n)
	} else {
		s.v = float64(s.r.Decay*s.v) + float64((1-s.r.Decay)*float64(x*x))
	}
	if s.window = append(s.window, x); len(s.window) > s.r.Window {
		s.window = s.window[1:]
	}
}

func medianOf(values []float64) float64 {
	sorted := slices.Sorted(slices.Values(values))
	n := len(sorted)
	return (sorted[(n-1)/2] + sorted[n/2]) / 2
}
