package rules

import (
	"fmt"
	"math"

	"strayd/stats"
)

// The gates that hold a file against the past need so much of it.
const (
	gateSeries = 10 // series that are compared
	gateDates  = 20 // dates held of each of them

	// TypicalDates is how many dates back a series' typical size is taken from.
	TypicalDates = 60
)

// Refusal is why a whole file is refused: what is wrong with it, and what to ask its provider for.
type Refusal struct {
	Date      Date
	Why, Ask  string
	LooksLike Cause // "" for none
}

// Compared is one value of a file with what is held of its series before the date.
type Compared struct {
	Return  Units
	Before  Units   // the newest value before; Missing for none
	Typical float64 // median of |return| over the last TypicalDates dates, a fraction; 0 for none
	Held    int     // values on those dates
	Repeats int     // of them, those equal to the value before and not zero
}

// FileDay is what a file brings for one date. Of very many series it is a sample.
type FileDay struct {
	Date   Date
	Values []Compared
	Prior  []float64 // SizeRatio of the dates before that are held, the newest first; NaN where there is none
}

// Where the size of a whole file cannot be right. On 1,799 days of a file of 20 series in four groups the ratio lay between 0.16 and 5.6
// on 99.8 % of days; 1/100 of it lies near 0.01, 100 times it near 92 (measured on index data of 1991 to 1998 and on invented series).
const (
	sizeLow, sizeHigh = 0.05, 15
	sizeX10000        = 1000 // between 92 and 9,200
)

// SizeRatio is the median, over the series with enough of a past, of |return| / typical size. The typical size is a median and not a
// deviation: in a file of money-market series |return| is about ten times the deviation. compared is how many series it is of.
func SizeRatio(values []Compared) (ratio float64, compared int) {
	var ratios []float64
	for _, c := range values {
		if c.Held >= gateDates && c.Typical > 0 && c.Return != Missing {
			ratios = append(ratios, math.Abs(c.Return.Float())/c.Typical)
		}
	}
	ratio, ok := stats.Median(ratios)
	if !ok {
		return math.NaN(), 0
	}
	return ratio, len(ratios)
}

// lowDays is how many days in a row a small file must be too small before that says something: the median of few values comes near zero
// on its own (two days from five series on; of one to four series 2.7 % a day, so three).
func lowDays(series int) int {
	switch {
	case series >= gateSeries:
		return 1
	case series >= 5:
		return 2
	}
	return 3
}

// RefuseScale refuses a file whose values as a whole are too large or too small to be right; nil when they are not.
func RefuseScale(d FileDay) *Refusal {
	ratio, n := SizeRatio(d.Values)
	switch {
	case n == 0:
		return nil
	case ratio > sizeHigh && n >= gateSeries:
		r := &Refusal{Date: d.Date, LooksLike: CauseX100, Ask: "ask the provider in which unit it was sent, and for the file in the declared one"}
		if ratio > sizeX10000 {
			r.LooksLike = CauseX10000
		}
		r.Why = fmt.Sprintf("its values are about %.4g times their usual size (median of %s)", ratio, Counted(n, "series"))
		return r
	case ratio < sizeLow && d.lowBefore(n):
		return refuseSmall(d, ratio, n)
	}
	return nil
}

// lowBefore says whether as many dates before were too small as it takes, this one counted.
func (d *FileDay) lowBefore(series int) bool {
	need := lowDays(series) - 1
	if len(d.Prior) < need {
		return false
	}
	for _, r := range d.Prior[:need] {
		if !(r < sizeLow) {
			return false
		}
	}
	return true
}

func refuseSmall(d FileDay, ratio float64, n int) *Refusal {
	for _, c := range d.Values {
		if c.Return != 0 && c.Return != Missing {
			return &Refusal{Date: d.Date, LooksLike: CauseDiv100, Ask: "ask the provider in which unit it was sent, and for the file in the declared one",
				Why: fmt.Sprintf("its values are about %.2g times their usual size (median of %s)", ratio, Counted(n, "series"))}
		}
	}
	return &Refusal{Date: d.Date, LooksLike: CauseZero, Why: fmt.Sprintf("all its values are zero (%s)", Counted(n, "series")),
		Ask: "ask the provider for the day's values, or whether it was a holiday"}
}

// naturalRepeat is the share of its own past days above which a series that repeats says nothing of its file: values of few digits and
// little movement repeat by themselves.
const naturalRepeat = 0.1

// RefuseRepeat refuses a file of which more than half repeats the values of the date before; nil when it does not. Zeros do not count, nor
// do series that repeat by themselves.
func RefuseRepeat(d FileDay) *Refusal {
	counted, same := 0, 0
	for _, c := range d.Values {
		if c.Held < gateDates || c.Before == Missing || c.Return == 0 && c.Before == 0 || (float64(c.Repeats)+0.5)/float64(c.Held+1) > naturalRepeat {
			continue
		}
		counted++
		if c.Return == c.Before {
			same++
		}
	}
	if counted < gateSeries || 2*same <= counted {
		return nil
	}
	return &Refusal{Date: d.Date, LooksLike: CauseRepeat,
		Why: fmt.Sprintf("%d of %d values are those of the date before: it looks like the previous file sent again", same, counted),
		Ask: fmt.Sprintf("ask the provider for the values of %s", d.Date.Day())}
}
