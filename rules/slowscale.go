package rules

import "fmt"

// The limits of `volatility`: far wider than those of an F test at 1 % (0.59 and 1.46), which takes values for normal and their scale for
// steady.
const (
	slowCalm = 0.5
	slowWild = 2.0
)

// ScaleRatio is the deviation of the newest 20 values over that of the up to 250 before them; ok is false where these are too few, or all the
// same.
func ScaleRatio(values []float64) (ratio float64, ok bool) {
	newest, before, ok := scales(values)
	if !ok {
		return 0, false
	}
	return newest / before, true
}

func scales(values []float64) (newest, before float64, ok bool) {
	n := len(values) - slowNewest
	if n < SlowLeast {
		return 0, 0, false
	}
	values = values[max(0, n-slowLong):]
	n = len(values) - slowNewest
	r := newRunning(values)
	_, before = r.of(0, n)
	_, newest = r.of(n, len(values))
	return newest, before, before > ScaleFloor
}

// volatility looks for another scale over weeks: smoothing and stale values below, leverage and a wrong unit above.
func (p *SlowPast) volatility() (SlowFinding, bool) {
	values, word := p.judged()
	newest, before, ok := scales(values)
	if !ok {
		return SlowFinding{}, false
	}
	ratio := newest / before
	if ratio >= slowCalm && ratio <= slowWild {
		return SlowFinding{}, false
	}
	return SlowFinding{Kind: KindVolatility, Up: ratio > 1, Note: fmt.Sprintf(
		"the deviation of the last %d %s, %s, is %.2f of that of the %d before, %s (limits %g and %g)",
		slowNewest, word, percentOf(newest), ratio, min(slowLong, len(values)-slowNewest), percentOf(before), slowCalm, slowWild)}, true
}

func percentOf(x float64) string { return fmt.Sprintf("%.3g %%", 100*x) }
