package stats

// Gate is the first, fast look at a column: for every number of values in a window, how far out a new value may lie and still
// be surely inside. Gate[n] belongs to n values, and the last entry to any more; below 0 nothing is surely inside. A gate is
// made once for a range and a window and only read.
//
// A gate errs on one side: it may ask for a close look at a value that is inside, never the reverse. Its margin of 1e-9 is far
// above the rounding of the comparison, which stays below 1e-14.
type Gate []float64

const gateMargin = 1 - 1e-9

// PlainGate is the gate of the plain scale for a Panel of this window. z is the line, in deviations, for a window of n values;
// predictive says whether the deviation is multiplied by sqrt(1+1/n). With fewer than least values nothing is surely inside.
//
//	inside  <=>  ((k - mean)/deviation)^2 <= z^2 (1+1/n)  <=>  (n k - S)^2 <= z^2 D (n+1)/(n-1)
//	without the factor                                         (n k - S)^2 <= z^2 D n/(n-1)
func PlainGate(window, least int, z func(n int) float64, predictive bool) Gate {
	return newGate(window, max(least, 2), func(n int) float64 {
		top := float64(n)
		if predictive {
			top++
		}
		return z(n) * z(n) * top / float64(n-1)
	})
}

// WeightedGate is the gate of a WeightedPanel: inside <=> x^2 <= z^2 v.
func WeightedGate(window, least int, z func(n int) float64) Gate {
	return newGate(window, max(least, 1), func(n int) float64 { return z(n) * z(n) })
}

// MADGate is the gate of SortedPanel.Scan: inside <=> |k - median| <= z NormalMAD MAD.
func MADGate(window, least int, z func(n int) float64) Gate {
	return newGate(window, max(least, 1), func(n int) float64 { return z(n) * NormalMAD })
}

func newGate(window, least int, limit func(n int) float64) Gate {
	g := make(Gate, window+1)
	for n := range g {
		g[n] = -1
		if n >= least {
			g[n] = limit(n) * gateMargin
		}
	}
	return g
}

// Fixed is the same line for every number of values.
func Fixed(z float64) func(int) float64 { return func(int) float64 { return z } }
