package causes

import "math"

// The line of doubt is the quantile of the log odds over the newest span dates. Histograms hold them: each value counts by the probability
// that it was no error after all,
//
//	1 / (1 + odds)
//
// so that true errors in the history do not raise the line. Values beyond a range's own line do not count: they are flagged anyway.
const (
	bins    = 160
	binSize = 0.125
	lowest  = -12.0 // log odds of the first bin's lower edge
	whole   = 256   // the weight of a value that is surely no error
)

// histogram is the log odds of one group over the newest span dates.
type histogram struct {
	weight [bins]int32
	n      int32 // values judged
	days   [slots]dayOdds
}

type dayOdds struct {
	judged int32
	odd    []oddBin
}

type oddBin struct {
	bin    uint8
	weight int16
}

func binOf(logOdds float64) int {
	return int(min(max((logOdds-lowest)/binSize, 0), bins-1))
}

func (h *histogram) expire(t int) {
	day := &h.days[(t-span-1)&mask]
	h.n -= day.judged
	for _, o := range day.odd {
		h.weight[o.bin] -= int32(o.weight)
	}
	day.judged, day.odd = 0, day.odd[:0]
}

func (h *histogram) take(t int, logOdds float64) {
	day := &h.days[t&mask]
	o := oddBin{uint8(binOf(logOdds)), int16(math.RoundToEven(whole / (1 + math.Exp(min(logOdds, 50)))))}
	day.odd = append(day.odd, o)
	h.weight[o.bin] += int32(o.weight)
}

func (h *histogram) judged(t int, n int32) {
	h.days[t&mask].judged += n
	h.n += n
}

const (
	poolLends  = 4000 // values that the whole pool counts for beside a group's own
	guessLends = 2000 // values that the guess counts for beside the pool's own
	guessEdge  = -1.0 // where the guess has its line: the tail of the log odds falls as 1/odds
)

// lines works out where doubt begins in each group: the lowest edge beyond which at most the configured share of values lies. It is never
// above even odds.
func (p *Pool) lines() {
	for g := range p.odds {
		p.line[g] = p.lineOf(g)
	}
}

func (p *Pool) lineOf(g int) float64 {
	all, own := &p.odds[len(p.odds)-1], &p.odds[g]
	var beyondAll, beyondOwn float64
	n, m := float64(all.n), float64(own.n)
	for b := bins - 1; b >= 0; b-- {
		edge := lowest + float64(b)*binSize
		beyondAll += float64(all.weight[b]) / whole
		beyondOwn += float64(own.weight[b]) / whole
		guess := p.doubtful * math.Exp(guessEdge-edge)
		share := (beyondAll + float64(guessLends*guess)) / (n + guessLends)
		share = (beyondOwn + float64(poolLends*share)) / (m + poolLends)
		if share > p.doubtful {
			return min(edge+binSize, 0)
		}
	}
	return lowest
}
