package rules

import (
	"fmt"
	"math"

	"strayd/stats"
)

// Follower is one series of a file beside a reference that another feed brings: how it followed it before, and both on the date.
type Follower struct {
	Return       float64
	Here, Before float64 // the reference on the date, and on the date before
	Line         FitLine
}

// FitLine is a least-squares line of a series on its reference.
type FitLine struct{ Intercept, Slope, Deviation float64 }

const (
	leastPairs  = 40  // for a line
	trimmed     = 4   // pairs further off than so many times the typical residual do not make the line
	leastFollow = 5   // followers for a verdict on a file
	shiftFits   = 1.5 // the median |residual| in deviations that still counts as fitting
	shiftEach   = 0.5 // by how much the log likelihood of each follower must be greater, on average
	shiftAll    = 10  // and that of all of them together
)

// Fit draws the least-squares line of y on x, without the pairs that lie far off a first one; ok is false when there are too few or x
// does not vary. Deviation has the divisor n-2.
func Fit(x, y []float64) (line FitLine, ok bool) {
	line, ok = leastSquares(x, y)
	if !ok || line.Deviation == 0 {
		return line, ok
	}
	sizes := make([]float64, len(x))
	for i := range x {
		sizes[i] = math.Abs(line.residual(x[i], y[i]))
	}
	typical, _ := stats.Median(sizes)
	var nearX, nearY []float64
	for i := range x {
		if sizes[i] <= trimmed*1.4826*typical {
			nearX, nearY = append(nearX, x[i]), append(nearY, y[i])
		}
	}
	if len(nearX) == len(x) {
		return line, true
	}
	return leastSquares(nearX, nearY)
}

func (l FitLine) residual(x, y float64) float64 { return y - l.Intercept - float64(l.Slope*x) }

func leastSquares(x, y []float64) (line FitLine, ok bool) {
	n := float64(len(x))
	if len(x) < leastPairs {
		return line, false
	}
	var meanX, meanY, xx, xy, ee float64
	for i := range x {
		meanX += x[i] / n
		meanY += y[i] / n
	}
	for i := range x {
		xx += float64((x[i] - meanX) * (x[i] - meanX))
		xy += float64((x[i] - meanX) * (y[i] - meanY))
	}
	if xx == 0 {
		return line, false
	}
	line.Slope = xy / xx
	line.Intercept = meanY - float64(line.Slope*meanX)
	for i := range x {
		e := line.residual(x[i], y[i])
		ee += float64(e * e)
	}
	line.Deviation = math.Sqrt(ee / (n - 2))
	return line, true
}

// RefuseShift refuses a file whose values fit the references of the date before and not those of the date; nil when they do not, or when a
// reference has no part in it. Each reference's followers are one slice: one that fits its own date speaks against a shift, so that a
// reference which is wrong by itself does not make the file look wrong.
func RefuseShift(date, before Date, byReference [][]Follower) *Refusal {
	gain, n := 0.0, 0
	var here, there []float64
	for _, followers := range byReference {
		own := 0.0
		for _, f := range followers {
			if f.Line.Deviation <= 0 {
				continue
			}
			h, b := f.Line.residual(f.Here, f.Return)/f.Line.Deviation, f.Line.residual(f.Before, f.Return)/f.Line.Deviation
			own += logT5(b) - logT5(h)
			here, there = append(here, math.Abs(h)), append(there, math.Abs(b))
		}
		if own < -shiftEach*float64(len(followers)) {
			return nil
		}
		gain, n = gain+own, n+len(followers)
	}
	fits, _ := stats.Median(there)
	off, _ := stats.Median(here)
	if n < leastFollow || gain < max(shiftAll, shiftEach*float64(n)) || fits > shiftFits || fits >= off {
		return nil
	}
	return &Refusal{Date: date, LooksLike: CauseShifted, Ask: "ask the provider for which day the values are",
		Why: fmt.Sprintf("its values fit the references of %s and not those of %s (%s): its dates look a day off", before.Day(), date.Day(),
			Counted(n, "series"))}
}

// logT5 is the log density, but for a constant, of a Student t with five degrees of freedom scaled to unit variance.
func logT5(z float64) float64 { return -3 * math.Log1p(z*z/3) }
