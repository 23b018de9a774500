package backrun

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"strayd/rules"
)

const (
	// LeastLevel is the smallest tail that is advised: the past of a series supports nothing rarer.
	LeastLevel = 0.0005
	// leastFlags is how many flags a level must rest on: with k of them its rate is known to about 1/sqrt(k). Common practice, no source.
	leastFlags = 10
	// LeastDates is how many dates say something of a week: a quarter of a year. Common practice, no source.
	LeastDates = 60

	resamples  = 1000
	blockDates = 20 // long enough for flags that come in clusters
	central    = 0.9
)

// Advice is the breach line that keeps a side to a budget of flags a week, and how sure that is.
type Advice struct {
	Budget float64
	Level  float64 // tail probability, in two digits; 0 where there is none
	Why    string  // why there is none, or why it is not the one that the budget asks for
	Flags  int     // those that the level would have raised
	Dates  int
	Others int // of these, flags that do not depend on the line

	// Over resamples of the dates, the middle 90 %.
	LevelLow, LevelHigh float64 // the level; 0 where no level keeps to the budget
	RateLow, RateHigh   float64 // flags a week at Level

	// The level that the first half of the dates gives, and the flags a week that it has in the second half; absent where the first half
	// gives none.
	HalfLevel, HalfRate rules.Num
}

// Rate is the flags a week of the level over the dates.
func (a *Advice) Rate() float64 { return datesAWeek * float64(a.Flags) / float64(a.Dates) }

// counting is what a level counts: the flags of each date that come whatever the line, and the tails of the others.
type counting struct {
	always []int
	tails  []Tail
	widest float64
}

// Advise finds the level for the estimated ranges of a side together, over its dates. The dates are resampled in circular blocks (Politis
// and Romano 1992, in: Exploring the Limits of Bootstrap, 263-270), since flags cluster.
func (s *Side) Advise(dates []rules.Date, budget float64) *Advice {
	c := s.counting(dates)
	a := &Advice{Budget: budget, Dates: len(dates)}
	for _, n := range c.always {
		a.Others += n
	}
	if len(dates) < LeastDates {
		a.Why = fmt.Sprintf("too little data to say: %s, %d are needed", rules.Counted(len(dates), "date"), LeastDates)
		return a
	}
	whole := slices.Repeat([]int{1}, len(dates))
	level, ok := c.level(whole, budget)
	if !ok {
		a.Why = fmt.Sprintf("flags that no breach line changes come to %.2f a week alone", datesAWeek*float64(a.Others)/float64(len(dates)))
		return a
	}
	a.Level = level
	switch {
	case level >= c.widest:
		a.Level, a.Why = down(c.widest), fmt.Sprintf("even at %s there are fewer than the budget allows", rules.InPercentPlain(down(c.widest)))
	case level < LeastLevel:
		a.Level, a.Why = LeastLevel, fmt.Sprintf("the budget asks for a rarer line than %s, which the past of a series cannot support",
			rules.InPercentPlain(LeastLevel))
	default:
		a.Level = down(level)
	}
	if a.Flags = c.count(whole, a.Level); a.Flags < leastFlags {
		a.Why = fmt.Sprintf("too little data to say: the budget comes to %s in %s, and a level needs %d", rules.Counted(a.Flags, "flag"),
			rules.Counted(len(dates), "date"), leastFlags)
		a.Level = 0
		return a
	}
	a.resample(c)
	a.halves(c)
	return a
}

func (s *Side) counting(dates []rules.Date) *counting {
	c := &counting{always: make([]int, len(dates)), widest: s.Widest}
	for i := range s.Flags {
		if f := &s.Flags[i]; f.Kind != rules.KindBreach {
			if n, ok := slices.BinarySearch(dates, f.Date); ok {
				c.always[n]++
			}
		}
	}
	for _, t := range s.Tails {
		switch {
		case !t.Always:
			c.tails = append(c.tails, t)
		case t.Breach: // else its flag is another kind, counted above
			c.always[t.Date]++
		}
	}
	return c
}

// level is the largest that keeps to a budget when each date counts so many times; ok is false where none does.
func (c *counting) level(times []int, budget float64) (level float64, ok bool) {
	dates, room := 0, 0.0
	for n, k := range times {
		dates += k
		room -= float64(k * c.always[n])
	}
	if room += budget * float64(dates) / datesAWeek; room < 0 {
		return 0, false
	}
	for _, t := range c.tails {
		if room -= float64(times[t.Date]); room < 0 {
			return t.Level, true
		}
	}
	return c.widest, true
}

// count is how many flags a level raises.
func (c *counting) count(times []int, level float64) (n int) {
	for d, k := range times {
		n += k * c.always[d]
	}
	for _, t := range c.tails {
		if t.Level >= level {
			break
		}
		n += times[t.Date]
	}
	return n
}

// resample draws the dates anew, always the same way.
func (a *Advice) resample(c *counting) {
	random := rand.New(rand.NewPCG(1, 0))
	levels, rates := make([]float64, resamples), make([]float64, resamples)
	times := make([]int, a.Dates)
	for r := range resamples {
		clear(times)
		for left := a.Dates; left > 0; left -= blockDates {
			from := random.IntN(a.Dates)
			for n := range min(left, blockDates) {
				times[(from+n)%a.Dates]++
			}
		}
		levels[r], _ = c.level(times, a.Budget)
		rates[r] = datesAWeek * float64(c.count(times, a.Level)) / float64(a.Dates)
	}
	a.LevelLow, a.LevelHigh = middle(levels)
	a.RateLow, a.RateHigh = middle(rates)
}

// middle is the central part of some figures.
func middle(v []float64) (low, high float64) {
	slices.Sort(v)
	cut := int(math.Round((1 - central) / 2 * float64(len(v))))
	return v[cut], v[len(v)-1-cut]
}

// halves holds the level of the first half of the dates against the second.
func (a *Advice) halves(c *counting) {
	half := a.Dates / 2
	first, second := make([]int, a.Dates), make([]int, a.Dates)
	for n := range first {
		if n < half {
			first[n] = 1
		} else {
			second[n] = 1
		}
	}
	level, ok := c.level(first, a.Budget)
	if !ok || level <= 0 {
		return
	}
	a.HalfLevel = rules.Some(level)
	a.HalfRate = rules.Some(datesAWeek * float64(c.count(second, level)) / float64(a.Dates-half))
}

// down rounds a level down to two digits.
func down(level float64) float64 {
	unit := math.Pow(10, math.Floor(math.Log10(level))-1)
	digits := math.Floor(level/unit + 1e-9)
	if unit < 1 { // a decimal fraction comes out as written
		return digits / math.Round(1/unit)
	}
	return digits * unit
}

// Apply puts the breach line of every estimated range at a level, and names those that cannot have it: a rank range whose window is too
// short for it, and one whose inner line lies farther out.
func Apply(s rules.Settings, level float64) (out rules.Settings, kept []string) {
	out = s
	out.Ranges = slices.Clone(s.Ranges)
	for n, r := range out.Ranges {
		if r.Limit != nil {
			continue
		}
		r.Breach = rules.Line{Tail: level}
		g, err := rules.NewGauge(r)
		if err != nil {
			kept = append(kept, r.Name)
			continue
		}
		inner, ok := g.Forms(r.Watch)
		if ok && inner.Tail < level || r.Tail.Name == "rank" && level < 2/float64(r.Window+1) {
			kept = append(kept, r.Name)
			continue
		}
		out.Ranges[n] = r
	}
	return out, kept
}
