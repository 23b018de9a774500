package causes

import (
	"math"
	"slices"

	"strayd/stats"
)

// alike is how much the followers of a benchmark move together beyond it: small companies beside an index of large ones. It is learnt from the
// median of their residuals, each in its deviations, on the last long dates.
type alike struct {
	today  float64             // NaN for none
	common [scaleSlots]float64 // by date
	n      int
	square float64 // robust: of 1.4826 times the median size, so that days on which the benchmark was wrong do not hide the next
}

const (
	ofMedian   = math.Pi / 2 // variance of a median over that of the mean (normal values)
	likeGuess  = 0.1         // mean square before anything is learnt
	guessDates = 10          // that it counts for
	mostCommon = 4           // deviations that one date counts for
	nearCommon = 4           // deviations of the common residual within which a day is as days are, of followers that have nothing in common
	farCommon  = 6           // the same of followers that move as one
)

func newAlike() alike {
	a := alike{today: math.NaN()}
	for i := range a.common {
		a.common[i] = math.NaN()
	}
	return a
}

// inCommon is the median residual of a benchmark's followers.
func (p *Pool) inCommon(b int) float64 {
	row := p.sizes[:0]
	for _, i := range p.followers[b] {
		if lk := &p.looks[i]; lk.hasRef && lk.judged {
			row = append(row, lk.z)
		}
	}
	p.sizes = row
	if len(row) < leastFollowers {
		return math.NaN()
	}
	slices.Sort(row)
	return middle(row)
}

// learn takes what followers had in common on date t into account from the next date on.
func (a *alike) learn(t int) {
	a.common[t&scaleMask] = min(max(a.today, -mostCommon), mostCommon)
	a.today = math.NaN()
	a.n, a.square = 0, 0
	var sizes [long]float64
	for k := t - long + 1; k <= t; k++ {
		if d := a.common[k&scaleMask]; d == d {
			sizes[a.n] = math.Abs(d)
			a.n++
		}
	}
	if a.n > 0 {
		slices.Sort(sizes[:a.n])
		deviation := stats.NormalMAD * middle(sizes[:a.n])
		a.square = deviation * deviation
	}
}

// meanSquare is that of the median residual of n followers.
func (a *alike) meanSquare(n int) float64 {
	guess := max(likeGuess, ofMedian/float64(n))
	return max((float64(a.n)*a.square+guessDates*guess)/(float64(a.n)+guessDates), 1e-3)
}

// weight is what each of n followers counts for: together no more than as many that have nothing in common beyond the benchmark.
func (a *alike) weight(n int) float64 {
	return min(1, ofMedian/(float64(n)*a.meanSquare(n)))
}

// usual says that the followers are off together no further than they are on other days.
func (a *alike) usual(n int) bool {
	far := nearCommon + float64((farCommon-nearCommon)*(1-a.weight(n)))
	return math.Abs(a.today) < far*math.Sqrt(a.meanSquare(n))
}
