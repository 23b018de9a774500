package causes

import "math"

// The line of doubt is the quantile of the log odds over the newest span dates. A history may hold errors that nobody has decided, so each
// value counts by the probability that it was none,
//
//	1 / (1 + rate odds)
//
// where rate, how much more or less often than the priors say values are wrong, is learnt from the same history (the two-groups model of
// Efron 2008, Statistical Science 23:1-22). Values beyond a range's own line do not count: they are flagged anyway.
const (
	bins    = 112
	binSize = 0.125
	lowest  = -6.0 // log odds of the first bin's lower edge
)

// histogram is the log odds of one group over the newest span dates.
type histogram struct {
	count [bins]int32
	n     int32 // values judged
	far   int32 // of those, beyond the breach line and no errors
	days  [slots]dayOdds
}

type dayOdds struct {
	judged, far int32
	bins        []uint8
}

func binOf(logOdds float64) int {
	return int(min(max((logOdds-lowest)/binSize, 0), bins-1))
}

func (h *histogram) expire(t int) {
	day := &h.days[(t-span-1)&mask]
	h.n -= day.judged
	h.far -= day.far
	for _, b := range day.bins {
		h.count[b]--
	}
	day.judged, day.far, day.bins = 0, 0, day.bins[:0]
}

func (h *histogram) take(t int, logOdds float64) {
	day := &h.days[t&mask]
	b := uint8(binOf(logOdds))
	day.bins = append(day.bins, b)
	h.count[b]++
}

func (h *histogram) judged(t int, n int32) {
	h.days[t&mask].judged += n
	h.n += n
}

// happened counts a far value that is no error.
func (h *histogram) happened(t int) {
	h.days[t&mask].far++
	h.far++
}

const (
	usualRate = 3.5e-3 // of things that happen, before anything is learnt
	farTail   = 0.0027 // share of values beyond the breach line by the tail alone
	farShare  = 0.55   // share of what happens that lies beyond it: of half with the deviation of returns nearly all, of the rest few
	mostRate  = 0.02
	leastRate = 1e-3
)

// happensIn is how often something happens in a group.
func (h *histogram) happensIn() float64 {
	more := (float64(h.far) - float64(farTail*float64(h.n))) / farShare
	return min(max((more+float64(usualRate*poolLends))/(float64(h.n)+poolLends), leastRate), mostRate)
}

const (
	poolLends  = 4000 // values that the whole pool counts for beside a group's own
	guessLends = 2000 // values that the guess counts for beside the pool's own
	guessEdge  = -1.0 // where the guess has its line: the tail of the log odds falls as 1/odds
	leastLine  = -4.0
	wrongShare = 5e-3 // of all values, by the priors
)

// learn renews, once a week, how probably a value of given log odds is no error, and how often something happens.
func (p *Pool) learn() {
	if !p.newWeek {
		return
	}
	for b := range p.binOdds {
		p.binOdds[b] = math.Exp(lowest + (float64(b)+0.5)*binSize)
	}
	rate := p.odds[len(p.odds)-1].rate(&p.binOdds)
	for b := range p.sound {
		p.sound[b] = 1 / (1 + float64(rate*p.binOdds[b]))
	}
	for g := range p.odds {
		p.happens[g] = p.odds[g].happensIn()
	}
}

// doubtFrom is where doubt begins in a group today: the lowest edge beyond which at most the configured share of values lies. It is never
// above even odds, and never below leastLine.
func (p *Pool) doubtFrom(g int) float64 {
	l := &p.line[g]
	if l.t != p.t {
		l.t, l.at = p.t, max(p.lineOf(g), leastLine)
	}
	return l.at
}

// lineAt is a line with the date that it was worked out for.
type lineAt struct {
	t  int
	at float64
}

// rate is the likeliest factor of the priors, between 0.01 and 10: where
//
//	sum odds/(1 + rate odds) = n share/(1 + rate share)
//
// found by bisection of its logarithm; the left side less the right falls in it.
func (h *histogram) rate(binOdds *[bins]float64) float64 {
	low, high := math.Log(0.01), math.Log(10)
	for range 12 {
		mid := (low + high) / 2
		rate := math.Exp(mid)
		left := 0.0
		for b, n := range h.count {
			if n > 0 {
				left += float64(n) * (binOdds[b] / (1 + float64(rate*binOdds[b])))
			}
		}
		if n := float64(h.n) + guessLends; left > n*wrongShare/(1+float64(rate*wrongShare)) {
			low = mid
		} else {
			high = mid
		}
	}
	return math.Exp((low + high) / 2)
}

func (p *Pool) lineOf(g int) float64 {
	all, own := &p.odds[len(p.odds)-1], &p.odds[g]
	var beyondAll, beyondOwn float64
	n, m := float64(all.n), float64(own.n)
	for b := bins - 1; b >= 0; b-- {
		edge := lowest + float64(b)*binSize
		beyondAll += float64(float64(all.count[b]) * p.sound[b])
		beyondOwn += float64(float64(own.count[b]) * p.sound[b])
		guess := p.doubtful * math.Exp(guessEdge-edge)
		share := (beyondAll + float64(guessLends*guess)) / (n + guessLends)
		share = (beyondOwn + float64(poolLends*share)) / (m + poolLends)
		if share > p.doubtful {
			return min(edge+binSize, 0)
		}
	}
	return lowest
}
