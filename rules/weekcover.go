package rules

import (
	"cmp"
	"math"
	"slices"

	"strayd/stats"
)

// The share beyond the line at which coverage is counted, and over how many observations: Basle Committee, Supervisory framework for the
// use of backtesting, January 1996; CESR/10-788.
const (
	CoverShare  = 0.01
	CoverDates  = 250
	mostBeyond  = 4 // CESR/10-788: more than four in 250 days are looked into
	coverDoubt  = 0.05
	leastMoving = 20 // dates that say how much series move together
)

// Cover is what one range concluded of one group's series over the dates up to the end of a week.
type Cover struct {
	Range   string
	Of      Basis
	Group   string
	Level   float64 // share that the breach line promises beyond it; 0 where it states none
	Share   float64 // CoverShare, or the watch line's where the range cannot speak of one in a hundred
	Days    []CoverDay
	Series  int // with at least one judged value
	Outer   CoverTally
	Inner   CoverTally
	Notable []SeriesCover // more than mostBeyond beyond the inner line; by number beyond, then name
	Zones   Zones         // of the series with CoverDates judged
	None    int           // of these, how many have nothing beyond the inner line
}

// CoverDay counts the judged values of one date, those beyond the breach line, and those beyond the inner line (Share).
type CoverDay struct {
	Date                 Date
	Judged, Outer, Inner int
}

// CoverTally counts the newest CoverDates judged values of every series, those beyond a line, and what followed what.
type CoverTally struct {
	Judged, Beyond int
	Transitions    stats.Transitions
}

// Add sums two tallies.
func (t *CoverTally) Add(o CoverTally) {
	t.Judged += o.Judged
	t.Beyond += o.Beyond
	t.Transitions.N00 += o.Transitions.N00
	t.Transitions.N01 += o.Transitions.N01
	t.Transitions.N10 += o.Transitions.N10
	t.Transitions.N11 += o.Transitions.N11
}

// SeriesCover is the coverage of one series at the inner line.
type SeriesCover struct {
	Series, Group string
	CoverTally
	Verdict CoverVerdict
	Zone    stats.Zone
}

// Zones count series by their zone.
type Zones struct{ Green, Yellow, Red int }

// CoverVerdict says how a count agrees with what a line promises.
type CoverVerdict string

// The verdicts on coverage.
const (
	Consistent CoverVerdict = "consistent with the promise"
	TooMany    CoverVerdict = "too many"
	TooFew     CoverVerdict = "too few"
	TooLittle  CoverVerdict = "too little data to say"
)

// Coverage is the verdict on one tally.
type Coverage struct {
	CoverTally
	Expected float64
	Kupiec   Num // probability of a count as far off
	Moving   Num // the same, allowing for series that move together; that of Kupiec for one series
	Apart    Num // Christoffersen: probability that beyond follows beyond as often, by chance
	Verdict  CoverVerdict
	Cluster  bool // beyond follows beyond more often than chance
}

// Judge holds a tally against the share that its line promises. together is how much wider the counts of a day scatter than those of
// series that move apart, at least 1: the ratio is divided by it (Rao and Scott 1981, Journal of the American Statistical Association
// 76:221-230). Under CoverDates judged, or where none at all would be consistent too, there is too little to say.
func (t CoverTally) Judge(share, together float64) Coverage {
	c := Coverage{CoverTally: t, Expected: float64(t.Judged) * share, Verdict: TooLittle}
	test, err := stats.Kupiec(t.Beyond, t.Judged, share)
	if err != nil {
		return c
	}
	c.Kupiec, c.Moving = Some(test.P), Some(test.P)
	if together > 1 {
		p, _ := stats.ChiSquared(test.LR/together, 1)
		c.Moving = Some(p)
	}
	if n := t.Transitions; n.N01+n.N11 > 0 && n.N10+n.N11 > 0 {
		apart := n.Independence()
		c.Apart = Some(apart.P)
		c.Cluster = apart.P < coverDoubt && float64(n.N11)*float64(n.N00) > float64(n.N01)*float64(n.N10)
	}
	none, _ := stats.Kupiec(0, t.Judged, share)
	noneP, _ := stats.ChiSquared(none.LR/max(together, 1), 1)
	switch {
	case t.Judged < CoverDates:
	case c.Moving.V < coverDoubt && float64(t.Beyond) > c.Expected:
		c.Verdict = TooMany
	case c.Moving.V < coverDoubt:
		c.Verdict = TooFew
	case noneP < coverDoubt:
		c.Verdict = Consistent
	}
	return c
}

// Together is how much wider the counts of a date scatter than independent series would have it: the variance of the counts about the
// common share over the binomial one, at least 1; 1 for fewer than 20 dates.
//
//	(1/D) sum (h - n s)^2 / (n s (1 - s)),  s = sum h / sum n
func Together(days []CoverDay, of func(*CoverDay) int) float64 {
	var hits, judged float64
	for i := range days {
		hits += float64(of(&days[i]))
		judged += float64(days[i].Judged)
	}
	if len(days) < leastMoving || hits == 0 || hits == judged {
		return 1
	}
	share, sum, used := hits/judged, 0.0, 0
	for i := range days {
		if n := float64(days[i].Judged); n > 0 {
			d := float64(of(&days[i])) - n*share
			sum += d * d / (n * share * (1 - share))
			used++
		}
	}
	return max(1, sum/float64(used))
}

// OuterOf and InnerOf are the counts of a day beyond the one and the other line.
func OuterOf(d *CoverDay) int { return d.Outer }

// InnerOf is the count beyond the inner line.
func InnerOf(d *CoverDay) int { return d.Inner }

// Within is the part of the days that lies in a span.
func Within(days []CoverDay, from, to Date) []CoverDay {
	at := func(d Date) int {
		n, _ := slices.BinarySearchFunc(days, d, func(x CoverDay, d Date) int { return int(x.Date) - int(d) })
		return n
	}
	return days[at(from):at(to+1)]
}

// Band is the middle 95 % of the count of hits among n that a share promises: for independent series, and widened for those that move
// together, which stand for as many fewer independent ones.
func Band(n int, share, together float64) (low, high int) {
	if n == 0 || !(share > 0 && share < 1) {
		return 0, 0
	}
	size := max(1, int(math.Round(float64(n)/max(together, 1))))
	scale := float64(n) / float64(size)
	return int(math.Round(scale * float64(quantile(size, share, 0.025)))), int(math.Round(scale * float64(quantile(size, share, 0.975))))
}

// quantile is the smallest k of which P(X <= k) reaches p.
func quantile(n int, share, p float64) int {
	low, high := 0, n
	for low < high {
		k := (low + high) / 2
		if atMost, err := stats.BinomialAtMost(k, n, share); err != nil || atMost >= p {
			high = k
		} else {
			low = k + 1
		}
	}
	return low
}

// Pool sums covers of several groups under one range.
func Pool(covers []Cover) (p Cover) {
	days := map[Date]*CoverDay{}
	for i := range covers {
		c := &covers[i]
		p.Range, p.Of, p.Level, p.Share = c.Range, c.Of, c.Level, c.Share
		p.Series += c.Series
		p.None += c.None
		p.Outer.Add(c.Outer)
		p.Inner.Add(c.Inner)
		p.Zones.Green += c.Zones.Green
		p.Zones.Yellow += c.Zones.Yellow
		p.Zones.Red += c.Zones.Red
		p.Notable = append(p.Notable, c.Notable...)
		for _, d := range c.Days {
			if days[d.Date] == nil {
				days[d.Date] = &CoverDay{Date: d.Date}
			}
			sum := days[d.Date]
			sum.Judged, sum.Outer, sum.Inner = sum.Judged+d.Judged, sum.Outer+d.Outer, sum.Inner+d.Inner
		}
	}
	for _, d := range days {
		p.Days = append(p.Days, *d)
	}
	slices.SortFunc(p.Days, func(a, b CoverDay) int { return int(a.Date) - int(b.Date) })
	p.Sort()
	return p
}

// Take counts one series, with its newest CoverDates judged values at the outer and the inner line.
func (c *Cover) Take(series string, outer, inner CoverTally) { c.TakeLong(series, outer, inner, inner) }

// TakeLong counts one series with any number of judged values; newest are the last CoverDates of those at the inner line, by which it has
// its zone.
func (c *Cover) TakeLong(series string, outer, inner, newest CoverTally) {
	if inner.Judged == 0 {
		return
	}
	c.Series++
	c.Outer.Add(outer)
	c.Inner.Add(inner)
	if newest.Judged < CoverDates {
		return
	}
	s := SeriesCover{Series: series, Group: c.Group, CoverTally: newest}
	s.Verdict = newest.Judge(c.Share, 1).Verdict
	s.Zone, _ = stats.ZoneOf(newest.Beyond, newest.Judged, c.Share)
	switch s.Zone {
	case stats.Red:
		c.Zones.Red++
	case stats.Yellow:
		c.Zones.Yellow++
	default:
		c.Zones.Green++
	}
	if newest.Beyond == 0 {
		c.None++
	}
	if newest.Beyond > mostBeyond {
		c.Notable = append(c.Notable, s)
	}
}

// Sort puts the notable series in order: most beyond first, then by name.
func (c *Cover) Sort() {
	slices.SortFunc(c.Notable, func(a, b SeriesCover) int { return cmp.Or(b.Beyond-a.Beyond, cmp.Compare(a.Series, b.Series)) })
}

// Whole is how many series have a zone.
func (z Zones) Whole() int { return z.Green + z.Yellow + z.Red }

// Chance is how many of the whole series would have more than mostBeyond, and how many nothing, beyond the inner line by chance.
func (c *Cover) Chance() (many, none float64) {
	n := float64(c.Zones.Whole())
	more, err := stats.BinomialAtLeast(mostBeyond+1, CoverDates, c.Share)
	if err != nil {
		return 0, 0
	}
	nothing, _ := stats.BinomialAtMost(0, CoverDates, c.Share)
	return n * more, n * nothing
}
