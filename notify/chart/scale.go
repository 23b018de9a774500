package chart

import (
	"math"
	"slices"
	"strconv"
	"time"

	"strayd/rules"
)

// tick is a marked place of an axis.
type tick struct {
	at   float64
	text string
}

// extent is the least and the greatest return that are drawn to scale: 0, the middle 90 % of returns and lines without the
// marked one, then whatever lies within twice that span beyond.
func extent(c *rules.Chart) (low, high float64) {
	var lines, values []float64
	marked := rules.Num{}
	for _, p := range c.Points {
		for _, n := range []rules.Num{p.Low, p.High, p.WatchLow, p.WatchHigh} {
			if n.OK {
				lines = append(lines, n.V)
			}
		}
		if p.Reference.OK {
			values = append(values, p.Reference.V)
		}
		if p.Date == c.Marked {
			marked = rules.Some(p.Return)
			continue
		}
		values = append(values, p.Return)
	}
	slices.Sort(values)
	slices.Sort(lines)
	for _, v := range append(middle(values), middle(lines)...) {
		low, high = min(low, v), max(high, v)
	}
	low, high = widened(low, high, append(append(values, lines...), marked.V))
	gap := 0.06 * (high - low)
	return low - gap, high + gap
}

// widened takes in what lies within twice the span beyond it; anything, where there is no span.
func widened(low, high float64, values []float64) (float64, float64) {
	reach := 2 * (high - low)
	if reach == 0 {
		reach = math.Inf(1)
	}
	from, to := low-reach, high+reach
	for _, v := range values {
		if v >= from && v <= to {
			low, high = min(low, v), max(high, v)
		}
	}
	if low == high {
		return low - 0.001, high + 0.001
	}
	return low, high
}

// middle leaves out a twentieth at each end. The lines of a range that has only just begun are wide.
func middle(sorted []float64) []float64 {
	trim := len(sorted) / 20
	return slices.Clone(sorted[trim : len(sorted)-trim])
}

// returnTicks are round returns, two to six of them.
func returnTicks(low, high float64) (out []tick) {
	step := roundStep((high - low) / 5)
	decimals := max(0, int(math.Ceil(-math.Log10(step*100)-1e-9)))
	for k := int(math.Ceil(low / step)); float64(k)*step <= high; k++ {
		v := float64(k) * step
		s := strconv.FormatFloat(v*100, 'f', decimals, 64) + " %"
		if k > 0 {
			s = "+" + s
		}
		out = append(out, tick{v, s})
	}
	return out
}

// roundStep is the least of 1, 2 or 5 times a power of ten that is at least v.
func roundStep(v float64) float64 {
	power := math.Pow(10, math.Floor(math.Log10(v)))
	for _, k := range []float64{1, 2, 5} {
		if k*power >= v*(1-1e-9) {
			return k * power
		}
	}
	return 10 * power
}

// dateTicks are the beginnings of months or weeks, at most six.
func dateTicks(from, to rules.Date) (out []tick) {
	if to-from < 70 {
		return weekTicks(from, to)
	}
	const most = 5
	months := int(to-from)/30 + 1
	step := 12 * (months/(12*most) + 1)
	for _, k := range []int{1, 2, 3, 6, 12} {
		if months <= k*most {
			step = k
			break
		}
	}
	for t := from.Time(); ; t = t.AddDate(0, 1, 0) {
		t = time.Date(t.Year(), t.Month(), 1, 0, 0, 0, 0, time.UTC)
		d := rules.DateFrom(t)
		if d > to {
			return out
		}
		if d >= from && (t.Year()*12+int(t.Month())-1)%step == 0 {
			out = append(out, tick{float64(d), t.Format("Jan 2006")})
		}
	}
}

func weekTicks(from, to rules.Date) (out []tick) {
	step := rules.Date(7)
	if to-from >= 35 {
		step = 14
	}
	first := from
	for first.Weekday() != time.Monday {
		first++
	}
	for d := first; d <= to; d += step {
		out = append(out, tick{float64(d), d.Time().Format("2 Jan")})
	}
	return out
}
