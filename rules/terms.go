package rules

import (
	"fmt"
	"math"
	"strings"
)

// Terms are what comes with a value besides its number. The zero value is the ordinary case: one business day, not an estimate.
type Terms struct {
	Days     int  // business days that the value covers; 0 and 1 are one
	Estimate bool // the provider calls it an estimate
}

// Span is the number of business days, at least 1.
func (t Terms) Span() int { return max(t.Days, 1) }

// Daily says that the value covers one business day: only such a value enters a window, and is weighed with others of its date.
func (t Terms) Daily() bool { return t.Days <= 1 }

// Code is the terms as one number, 0 in the ordinary case: the days, 0 for one, twice, plus 1 for an estimate.
func (t Terms) Code() int64 {
	code := int64(0)
	if !t.Daily() {
		code = 2 * int64(t.Days)
	}
	if t.Estimate {
		code++
	}
	return code
}

// TermsOf is the terms of a code.
func TermsOf(code int64) Terms { return Terms{Days: int(code >> 1), Estimate: code&1 == 1} }

// Covers says in words over how many business days a value goes, "" for one.
func (t Terms) Covers() string {
	if t.Daily() {
		return ""
	}
	return fmt.Sprintf("covers %d business days", t.Days)
}

// After says in words what changed from the terms of the value before it on the same date, "" for nothing. That an estimate comes in the
// place of a final value is taken, since the newest word of the provider counts, and said, since it is the wrong way round.
func (t Terms) After(before Terms) string {
	var words []string
	if before.Span() != t.Span() {
		words = append(words, fmt.Sprintf("covers %s, before %d", Counted(t.Span(), "business day"), before.Span()))
	}
	switch {
	case before.Estimate && !t.Estimate:
		words = append(words, "final after an estimate")
	case t.Estimate && !before.Estimate:
		words = append(words, "an estimate after a final value: ask which one stands")
	}
	return strings.Join(words, "; ")
}

// span is how many business days the value to be judged covers, as a factor of the centre.
func (p *Past) span() float64 { return float64(max(p.Days, 1)) }

// daily takes a value over k business days to where it would lie as a value of one day, at the same z-score: returns of k days on end, of
// mean m and deviation s each and independent, have the mean k m and the deviation sqrt(k) s, so
//
//	daily = m + (x - k m) / sqrt(k)
//
// with the centre for m. Half a unit of rounding at most.
func daily(x Units, center, k float64) Units {
	return Units(math.Round((center + (x.Float()-k*center)/math.Sqrt(k)) * one))
}

// over takes the lines for values of one day to where they lie for those over k: the inverse of daily.
func (l Lines) over(center, k float64) Lines {
	for _, n := range []*Num{&l.WatchLow, &l.WatchHigh, &l.Low, &l.High} {
		if n.OK {
			n.V = float64(k*center) + float64(math.Sqrt(k)*(n.V-center))
		}
	}
	return l
}
