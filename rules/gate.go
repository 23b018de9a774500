package rules

import (
	"fmt"
	"math"
	"slices"

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
	Zeros   int     // of them, those that are zero
	Tick    Units   // the last digit that they are written with; 0 where not known
}

// FileDay is what a file brings for one date. Of very many series it is a sample.
type FileDay struct {
	Date   Date
	Values []Compared
	Prior  []float64 // SizeRatio of the dates before that are held, the newest first; NaN where there is none
	// Past gives the returns of the n-th value's series on the dates before, the oldest first and the same dates for all, Missing where
	// there is none. It is asked only where the size of the file is odd.
	Past func(n int) []Units
}

// Where the size of a whole file cannot be right. On 1,799 days of a file of 20 series in four groups the ratio lay between 0.16 and 5.6
// on 99.8 % of days; 1/100 of it lies near 0.01, 100 times it near 92 (measured on index data of 1991 to 1998 and on invented series). But
// series that all follow one market stand still, or fall, together: what each leaves of its nearest companion decides.
const (
	sizeLow, sizeHigh = 0.05, 3
	apartLow          = 0.1  // of what series leave of each other, with sizeLow
	movedLow          = 0.15 // of the values that are not zero: coarse digits leave the larger ones
	movedApart        = 0.2  // of what these leave of each other
	apartHigh         = 15   // with sizeHigh
	aloneHigh         = 60   // where series leave nothing of each other: 40 deviations
	sizeX10000        = 1000 // between 92 and 9,200
	lowDays           = 3    // days in a row that a file is too small where nothing but its size tells: one series is on 2.7 % of days
)

// SizeRatio is the median, over the series with enough of a past, of |return| / typical size. The typical size is a median and not a
// deviation: in a file of money-market series |return| is about ten times the deviation. A zero counts for half the last digit, and not at all
// where zeros are a series' habit. compared is how many series it is of.
func SizeRatio(values []Compared) (ratio float64, compared int) {
	var ratios []float64
	for _, c := range values {
		if c.sized() {
			ratios = append(ratios, max(math.Abs(c.Return.Float()), c.Tick.Float()/2)/c.Typical)
		}
	}
	ratio, ok := stats.Median(ratios)
	if !ok {
		return math.NaN(), 0
	}
	return ratio, len(ratios)
}

// sized says that the size of a value can be held against the past.
func (c *Compared) sized() bool {
	return c.Held >= gateDates && c.Typical > 0 && c.Return != Missing && !(c.Return == 0 && habit(c.Zeros, c.Held))
}

// habit says that more than naturalShare of a series' own past days were so.
func habit(days, of int) bool { return (float64(days)+0.5)/float64(of+1) > naturalShare }

// RefuseScale refuses a file whose values as a whole are too large or too small to be right; nil when they are not.
func RefuseScale(d FileDay) *Refusal {
	ratio, n := SizeRatio(d.Values)
	switch {
	case n == 0:
		return nil
	case ratio > sizeHigh && n >= gateSeries && d.tooLarge(ratio):
		r := &Refusal{Date: d.Date, LooksLike: CauseX100, Ask: "ask the provider in which unit it was sent, and for the file in the declared one"}
		if ratio > sizeX10000 {
			r.LooksLike = CauseX10000
		}
		r.Why = fmt.Sprintf("its values are about %.4g times their usual size (median of %s)", ratio, Counted(n, "series"))
		return r
	case ratio < sizeLow && d.tooSmall():
		return refuseSmall(d, ratio, n)
	}
	return nil
}

func (d *FileDay) tooLarge(ratio float64) bool {
	apart, n := d.apart(anyValue)
	if n < gateSeries {
		return ratio > aloneHigh
	}
	return apart > apartHigh
}

// tooSmall says that what the series leave of each other is too small as well, or, where that says little, that the days before were too small.
func (d *FileDay) tooSmall() bool {
	if d.partMoved() {
		return false
	}
	if apart, n := d.apart(anyValue); n >= gateSeries {
		return apart < apartLow
	}
	if len(d.Prior) < lowDays-1 {
		return false
	}
	for _, r := range d.Prior[:lowDays-1] {
		if !(r < sizeLow) {
			return false
		}
	}
	return true
}

// partMoved says that the values which are not zero are of their usual size: the others may have a holiday.
func (d *FileDay) partMoved() bool {
	moved := slices.DeleteFunc(slices.Clone(d.Values), func(c Compared) bool { return c.Return == 0 })
	ratio, n := SizeRatio(moved)
	if n == 0 || ratio >= movedLow {
		return n > 0
	}
	apart, n := d.apart(func(c *Compared) bool { return c.Return != 0 })
	return n >= gateSeries && apart >= movedApart
}

func refuseSmall(d FileDay, ratio float64, n int) *Refusal {
	for _, c := range d.Values {
		if c.Return != 0 && c.sized() {
			return &Refusal{Date: d.Date, LooksLike: CauseDiv100, Ask: "ask the provider in which unit it was sent, and for the file in the declared one",
				Why: fmt.Sprintf("its values are about %.2g times their usual size (median of %s)", ratio, Counted(n, "series"))}
		}
	}
	return &Refusal{Date: d.Date, LooksLike: CauseZero, Why: fmt.Sprintf("all its values are zero (%s)", Counted(n, "series")),
		Ask: "ask the provider for the day's values, or whether it was a holiday"}
}

// naturalShare is the share of its own past days above which a series that repeats, or is zero, says nothing of its file: values of few
// digits and little movement do so by themselves.
const naturalShare = 0.1

// leastDistinct is how many different values must be there again, of series that do not move as one. Series that move little, or together, have
// few, and all of them may well come again.
const leastDistinct = 8

// RefuseRepeat refuses a file of which more than half repeats the values of the date before; nil when it does not. Zeros do not count, nor
// do series that repeat by themselves.
func RefuseRepeat(d FileDay) *Refusal {
	counted, same := 0, 0
	for _, c := range d.Values {
		if c.Held < gateDates || c.Before == Missing || c.Return == 0 && c.Before == 0 || habit(c.Repeats, c.Held) {
			continue
		}
		counted++
		if c.Return == c.Before {
			same++
		}
	}
	if counted < gateSeries || 2*same <= counted || d.distinctAgain() < leastDistinct {
		return nil
	}
	return &Refusal{Date: d.Date, LooksLike: CauseRepeat,
		Why: fmt.Sprintf("%d of %d values are those of the date before: it looks like the previous file sent again", same, counted),
		Ask: fmt.Sprintf("ask the provider for the values of %s", d.Date.Day())}
}

// distinctAgain counts the different values that are those of the date before, of series that leave something of each other.
func (d *FileDay) distinctAgain() int {
	again := func(c *Compared) bool { return c.Return == c.Before && c.Return != 0 }
	f := d.companions(again)
	distinct := map[Units]bool{}
	for i := range f {
		if _, ok := f.left(i); ok {
			distinct[f[i].value] = true
		}
	}
	return len(distinct)
}
