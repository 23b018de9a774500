package main

import (
	"math"
	"math/big"
	"slices"
	"time"

	"strayd/rules"
)

// The oracle judges by the definitions of the design, section 5, value by value, in rationals and big floats, and keeps nothing
// between two dates but the values used and the verdicts issued. It shares no code with the packages under test beyond the types
// rules.Date and rules.Units.

// oracleRange is a range in the oracle's words, and how it is written in the configuration.
type oracleRange struct {
	name, scale, tail, side, pending string
	window                           int
	predictive                       bool
	watch, breach                    oracleLine
	low, high                        rules.Units // of a limit
	limit                            bool
	text                             string // its line of the configuration
}

// oracleLine is a line stated as a tail probability, or in deviations where z is above 0.
type oracleLine struct{ p, z float64 }

// oracleVerdict is what the oracle concludes; figures that do not apply are NaN.
type oracleVerdict struct {
	finding                                    string
	provisional                                bool
	n                                          int
	from, to                                   rules.Date
	mean, deviation, z, tail, log10, low, high float64
	watchLow, watchHigh                        float64
}

// oracleObservation is the newest version of one observation.
type oracleObservation struct {
	date    rules.Date
	value   rules.Units
	late    bool
	changed int // how often it was restated
	flagged bool
	issued  []oracleVerdict // by range, when the newest version arrived
	used    []rules.Units   // by range, as of now; rules.Missing where it is left out
	decided bool            // of the newest version
	takes   rules.Units     // what windows take by that; rules.Missing for nothing
}

type oracle struct {
	ranges []oracleRange
	series map[string][]*oracleObservation // by date
}

// bookRow is one row of a file.
type bookRow struct {
	date   rules.Date
	series string
	value  rules.Units
}

func newOracle(ranges []oracleRange) *oracle {
	return &oracle{ranges, map[string][]*oracleObservation{}}
}

// take accepts the rows of one file: values equal to those held change nothing; the rest are judged date by date against what comes
// before them, and every window is replayed from the first change on.
func (o *oracle) take(file []bookRow) {
	fresh := map[string]map[rules.Date]bool{}
	for _, c := range file {
		if o.put(c) {
			if fresh[c.series] == nil {
				fresh[c.series] = map[rules.Date]bool{}
			}
			fresh[c.series][c.date] = true
		}
	}
	for series, dates := range fresh {
		o.replay(series, dates)
	}
}

// put stores a value and says whether it changes anything.
func (o *oracle) put(c bookRow) bool {
	held := o.series[c.series]
	at, ok := slices.BinarySearchFunc(held, c.date, func(h *oracleObservation, d rules.Date) int { return int(h.date) - int(d) })
	if ok {
		if held[at].value == c.value {
			return false
		}
		held[at].value = c.value
		held[at].changed++
		held[at].decided = false
		return true
	}
	// late: a newer date of the series was held before this file came. A file lists its dates in order, so that a newer one can
	// only be of an earlier file.
	n := &oracleObservation{date: c.date, value: c.value, late: at < len(held)}
	o.series[c.series] = slices.Insert(held, at, n)
	return true
}

func (o *oracle) replay(series string, fresh map[rules.Date]bool) {
	held := o.series[series]
	begun := false
	for i, h := range held {
		if begun = begun || fresh[h.date]; !begun {
			continue
		}
		verdicts := make([]oracleVerdict, len(o.ranges))
		for k := range o.ranges {
			verdicts[k] = o.judge(held[:i], k, h.date, h.value)
		}
		if fresh[h.date] {
			h.issued = verdicts
			h.flagged = tooLarge(h.value)
			for _, v := range verdicts {
				h.flagged = h.flagged || v.finding == "breach"
			}
		}
		h.used = make([]rules.Units, len(o.ranges))
		for k := range o.ranges {
			h.used[k] = o.usedValue(k, h, &verdicts[k])
		}
	}
}

// decide has the windows take something else of the newest version of an observation.
func (o *oracle) decide(series string, date rules.Date, takes rules.Units) {
	for _, h := range o.series[series] {
		if h.date == date {
			h.decided, h.takes = true, takes
		}
	}
	held := o.series[series]
	for i, h := range held {
		if h.date < date {
			continue
		}
		for k := range o.ranges {
			v := o.judge(held[:i], k, h.date, h.value)
			h.used[k] = o.usedValue(k, h, &v)
		}
	}
}

// breaches are the dates and ranges that the windows, as they are, would call a breach; dates are those after one.
func (o *oracle) breaches(series string, after rules.Date) map[string]bool {
	out := map[string]bool{}
	held := o.series[series]
	for i, h := range held {
		for k := range o.ranges {
			if h.date > after && !o.ranges[k].limit {
				out[h.date.String()+" "+o.ranges[k].name] = o.judge(held[:i], k, h.date, h.value).finding == "breach"
			}
		}
	}
	return out
}

// issued are those whose verdict, when it was issued, was a breach.
func (o *oracle) issued(series string) map[string]bool {
	out := map[string]bool{}
	for _, h := range o.series[series] {
		for k := range o.ranges {
			out[h.date.String()+" "+o.ranges[k].name] = h.issued[k].finding == "breach"
		}
	}
	return out
}

func tooLarge(x rules.Units) bool { return x > 100*1e15 || x < -100*1e15 }

// usedValue is what a window takes: the value; of a flagged one under clip the value held to the breach line, rounded to a unit
// toward the centre; without a line of its own held to the limits, and without either nothing.
func (o *oracle) usedValue(k int, h *oracleObservation, v *oracleVerdict) rules.Units {
	r := &o.ranges[k]
	switch {
	case !r.limit && h.decided:
		if tooLarge(h.takes) {
			return rules.Missing
		}
		return h.takes
	case r.limit, tooLarge(h.value), h.flagged && r.pending == "leave-out":
		return rules.Missing
	case !h.flagged || r.pending == "keep":
		return h.value
	}
	x := h.value
	if !math.IsNaN(v.low) && float64(x)/1e15 < v.low {
		x = rules.Units(math.Ceil(v.low * 1e15))
	}
	if !math.IsNaN(v.high) && float64(x)/1e15 > v.high {
		x = rules.Units(math.Floor(v.high * 1e15))
	}
	if !math.IsNaN(v.low) || !math.IsNaN(v.high) {
		return x
	}
	limited := false
	for _, l := range o.ranges {
		if l.limit {
			limited = true
			x = min(max(x, l.low), l.high)
		}
	}
	if !limited {
		return rules.Missing
	}
	return x
}

// slowWeekdays counts Mondays to Fridays after from up to and including to, one by one.
func slowWeekdays(from, to rules.Date) (n int) {
	for d := from + 1; d <= to; d++ {
		if day := time.Unix(int64(d)*86400, 0).UTC().Weekday(); day != time.Saturday && day != time.Sunday {
			n++
		}
	}
	return n
}

// windowBefore gathers the used observations before a date, oldest first: back to the first gap of more than 20 business days, and
// no more than the range's window of them (the weighted scale takes them all).
func (o *oracle) windowBefore(past []*oracleObservation, k int, date rules.Date) (values []rules.Units, from, to rules.Date) {
	r := &o.ranges[k]
	from, to = rules.NoDate, rules.NoDate
	later := date
	for i := len(past) - 1; i >= 0; i-- {
		if slowWeekdays(past[i].date, later) > 20 {
			break
		}
		if past[i].used[k] == rules.Missing {
			continue
		}
		if r.scale != "weighted" && len(values) == r.window {
			break
		}
		values = append(values, past[i].used[k])
		later, from = past[i].date, past[i].date
		if to == rules.NoDate {
			to = past[i].date
		}
	}
	slices.Reverse(values)
	return values, from, to
}

func (o *oracle) judge(past []*oracleObservation, k int, date rules.Date, x rules.Units) oracleVerdict {
	r := &o.ranges[k]
	nan := math.NaN()
	v := oracleVerdict{finding: "inside", from: rules.NoDate, to: rules.NoDate, mean: nan, deviation: nan, z: nan, tail: nan, log10: nan,
		low: nan, high: nan, watchLow: nan, watchHigh: nan}
	if r.limit {
		v.low, v.high = float64(r.low)/1e15, float64(r.high)/1e15
		if x < r.low || x > r.high {
			v.finding = "breach"
		}
		return v
	}
	values, from, to := o.windowBefore(past, k, date)
	v.n, v.from, v.to = len(values), from, to
	if v.n == 0 {
		v.finding = "not judged"
		return v
	}
	centre, deviation := estimate(r, values)
	v.mean, _ = centre.Float64()
	if deviation != nil {
		v.deviation, _ = deviation.Float64()
	}
	switch {
	case deviation == nil || deviation.Sign() == 0 || v.n < 2: // one value gives no degree of freedom
		v.finding = "not judged"
		return v
	case v.n < 5:
		v.finding = "not judged"
	case v.n < 20:
		v.provisional = true
	}
	judgeBy(r, &v, values, centre, deviation, x)
	return v
}

const bits = 200

func bigFloat(v float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(v) }

func bigUnits(x rules.Units) *big.Float {
	return new(big.Float).SetPrec(bits).Quo(new(big.Float).SetPrec(bits).SetInt64(int64(x)), bigFloat(1e15))
}

// judgeBy scores the value and draws the lines.
func judgeBy(r *oracleRange, v *oracleVerdict, values []rules.Units, centre, deviation *big.Float, x rules.Units) {
	thin := v.n < 20
	spread := new(big.Float).SetPrec(bits).Set(deviation)
	if floor := bigFloat(0.5e-4); spread.Cmp(floor) < 0 {
		spread.Set(floor)
	}
	if r.scale != "weighted" {
		if tick := tickDeviation(values); spread.Cmp(tick) < 0 {
			spread.Set(tick)
		}
	}
	if thin || r.tail == "predictive-t" || r.predictive && r.scale == "plain" {
		f := new(big.Float).SetPrec(bits).Quo(bigFloat(float64(v.n+1)), bigFloat(float64(v.n)))
		spread.Mul(spread, f.Sqrt(f))
	}
	z := new(big.Float).SetPrec(bits).Sub(bigUnits(x), centre)
	v.z, _ = z.Quo(z, spread).Float64()
	s, _ := spread.Float64()
	if r.tail == "rank" && !thin {
		rankBy(r, v, values, x)
		return
	}
	df := 0 // normal
	unit := true
	switch {
	case thin, r.tail == "predictive-t":
		df, unit = v.n-1, false
	case r.tail == "t5":
		df = 5
	}
	v.tail, v.log10 = oracleTail(v.z, df, unit, r.side)
	if v.finding == "not judged" {
		return
	}
	watch, breach := lineAt(r.watch, df, unit, r.side), lineAt(r.breach, df, unit, r.side)
	c, _ := centre.Float64()
	out := math.Abs(v.z)
	if r.side != "upper" {
		v.low, v.watchLow = c-breach*s, c-watch*s
		out = -v.z
	}
	if r.side != "lower" {
		v.high, v.watchHigh = c+breach*s, c+watch*s
		out = v.z
	}
	if r.side == "both" {
		out = math.Abs(v.z)
	}
	switch {
	case out > breach:
		v.finding = "breach"
	case out > watch:
		v.finding = "watch"
	}
}
