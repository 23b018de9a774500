package rules

import (
	"fmt"
	"math"

	"strayd/stats"
)

// Follower is one series of a file beside a reference that another feed brings: how it followed it before, and both on the date.
type Follower struct {
	Return                float64
	Here, Before, Earlier float64 // the reference on the date, on the date before, and on the one before that
	Line                  FitLine
}

// Followers are the series that are held against one reference.
type Followers struct {
	List []Follower
	// Alike is how much of what the reference leaves they have in common: the variance of the mean of their residuals, each in its deviation, on the
	// dates before. 1/len(List) where they have nothing in common.
	Alike float64
}

// weight is what each follower counts for where they move alike beyond the reference: together no more than as many that do not.
func (f *Followers) weight() float64 {
	return min(1, 1/(float64(len(f.List))*max(f.Alike, 1e-3)))
}

// FitLine is a least-squares plane of a series on its reference on the same date and on the date before: funds priced partly on yesterday's
// market follow both.
type FitLine struct{ Intercept, Slope, Lag, Deviation float64 }

// At is what the line foresees of a reference's returns on a date and on the one before.
func (l FitLine) At(x, before float64) float64 {
	return l.Intercept + float64(l.Slope*x) + float64(l.Lag*before)
}

const (
	leastPairs  = 40  // for a line
	trimmed     = 4   // pairs further off than so many times the typical residual do not make the line
	leastFollow = 5   // followers for a verdict on a file
	shiftFits   = 1.5 // the median |residual| in deviations that still counts as fitting
	shiftEach   = 0.5 // by how much the log likelihood of each follower must be greater, on average
	shiftAll    = 10  // and that of all of them together
)

// Pair is a return with its reference's returns of the date and of the one before.
type Pair struct{ X, Before, Y float64 }

// Fit draws the least-squares plane, without the pairs that lie far off a first one; ok is false when there are too few or the reference
// does not vary. Deviation has the divisor n-3.
func Fit(pairs []Pair) (line FitLine, ok bool) {
	line, ok = leastSquares(pairs)
	if !ok || line.Deviation == 0 {
		return line, ok
	}
	sizes := make([]float64, len(pairs))
	for i, p := range pairs {
		sizes[i] = math.Abs(p.Y - line.At(p.X, p.Before))
	}
	typical, _ := stats.Median(sizes)
	var near []Pair
	for i, p := range pairs {
		if sizes[i] <= trimmed*1.4826*typical {
			near = append(near, p)
		}
	}
	if len(near) == len(pairs) {
		return line, true
	}
	return leastSquares(near)
}

// leastSquares solves the two normal equations about the means.
func leastSquares(pairs []Pair) (line FitLine, ok bool) {
	n := float64(len(pairs))
	if len(pairs) < leastPairs {
		return line, false
	}
	var mean Pair
	for _, p := range pairs {
		mean.X, mean.Before, mean.Y = mean.X+p.X/n, mean.Before+p.Before/n, mean.Y+p.Y/n
	}
	var xx, bb, xb, xy, by float64
	for _, p := range pairs {
		x, b, y := p.X-mean.X, p.Before-mean.Before, p.Y-mean.Y
		xx, bb, xb, xy, by = xx+float64(x*x), bb+float64(b*b), xb+float64(x*b), xy+float64(x*y), by+float64(b*y)
	}
	det := float64(xx*bb) - float64(xb*xb)
	if det <= 1e-9*float64(xx*bb) {
		return line, false
	}
	line.Slope = (float64(bb*xy) - float64(xb*by)) / det
	line.Lag = (float64(xx*by) - float64(xb*xy)) / det
	line.Intercept = mean.Y - float64(line.Slope*mean.X) - float64(line.Lag*mean.Before)
	ee := 0.0
	for _, p := range pairs {
		e := p.Y - line.At(p.X, p.Before)
		ee += float64(e * e)
	}
	line.Deviation = math.Sqrt(ee / (n - 3))
	return line, true
}

// RefuseShift refuses a file whose values fit the references of the date before and not those of the date; nil when they do not, or when a
// reference has no part in it. Each reference's followers are one slice: one that fits its own date speaks against a shift, so that a
// reference which is wrong by itself does not make the file look wrong.
func RefuseShift(date, before Date, byReference []Followers) *Refusal {
	gain, n, counted := 0.0, 0, 0.0
	var here, there []float64
	for _, followers := range byReference {
		own := 0.0
		for _, f := range followers.List {
			if f.Line.Deviation <= 0 {
				continue
			}
			h := (f.Return - f.Line.At(f.Here, f.Before)) / f.Line.Deviation
			b := (f.Return - f.Line.At(f.Before, f.Earlier)) / f.Line.Deviation
			own += logT5(b) - logT5(h)
			here, there = append(here, math.Abs(h)), append(there, math.Abs(b))
		}
		if own < -shiftEach*float64(len(followers.List)) {
			return nil
		}
		weight := followers.weight()
		gain, n, counted = gain+weight*own, n+len(followers.List), counted+weight*float64(len(followers.List))
	}
	fits, _ := stats.Median(there)
	off, _ := stats.Median(here)
	if n < leastFollow || gain < max(shiftAll, shiftEach*counted) || fits > shiftFits || fits >= off {
		return nil
	}
	return &Refusal{Date: date, LooksLike: CauseShifted, Ask: "ask the provider for which day the values are",
		Why: fmt.Sprintf("its values fit the references of %s and not those of %s (%s): its dates look a day off", before.Day(), date.Day(),
			Counted(n, "series"))}
}

// logT5 is the log density, but for a constant, of a Student t with five degrees of freedom scaled to unit variance.
func logT5(z float64) float64 { return -3 * math.Log1p(z*z/3) }
