package causes

import (
	"math"
	"slices"
)

// fit is how a series follows its reference, estimated from the last span dates:
//
//	return = shift + slope reference + lag reference of the date before
type fit struct {
	shift, slope, lag float64
	n                 int
	mean, spread      float64 // of the reference: its mean and the sum of squares about it
	explains          float64 // share of the variance
	use               bool    // it explains enough
}

const (
	leastFit      = 20  // dates for a fit of its own
	leastExplains = 0.2 // share of the variance, below which a reference is no help
	lagLine       = 4   // t of the lag term from which it is kept
	lowSlope      = -0.5
	highSlope     = 3
	// LeastPeers is how many others must report for their median to stand for them.
	leastPeers = 7
)

// moments are sums over the dates that have a return, its reference and the reference of the date before.
type moments struct {
	n                      float64
	x, m, l                float64
	xx, mm, ll, xm, xl, ml float64
}

func (s *moments) add(x, m, l float64) {
	s.n++
	s.x += x
	s.m += m
	s.l += l
	s.xx += float64(x * x)
	s.mm += float64(m * m)
	s.ll += float64(l * l)
	s.xm += float64(x * m)
	s.xl += float64(x * l)
	s.ml += float64(m * l)
}

// centre turns sums of products into sums about the means.
func (s *moments) centre() {
	s.xx -= float64(s.x*s.x) / s.n
	s.mm -= float64(s.m*s.m) / s.n
	s.ll -= float64(s.l*s.l) / s.n
	s.xm -= float64(s.x*s.m) / s.n
	s.xl -= float64(s.x*s.l) / s.n
	s.ml -= float64(s.m*s.l) / s.n
}

// triple is a date's return with the reference's returns of the date and the one before.
type triple struct{ x, m, l float64 }

// pairs lists what the last span dates before t have, the oldest first, so that every pool rounds alike.
func (p *Pool) pairs(st *state) []triple {
	list := p.triples[:0]
	last := math.NaN()
	for k := p.t - span; k < p.t; k++ {
		x, m := st.used[k&mask], st.ref[k&mask]
		if x == x && m == m && last == last {
			list = append(list, triple{x, m, last})
		}
		last = m
	}
	p.triples = list
	return list
}

func sum(list []triple) (s moments) {
	for i := range list {
		s.add(list[i].x, list[i].m, list[i].l)
	}
	return s
}

const (
	farOff  = 6 // root mean squares of the residuals: one so far off calls for a robust start
	trimmed = 7 // robust deviations beyond which a date does not count
)

// estimate is the fit by least squares. Where some residual is far off, dates are left out that lie far from a robust line, that of least
// absolute deviations through the origin, and the rest is fitted again (reweighted least squares, Rousseeuw and Leroy 1987, Robust
// Regression and Outlier Detection, chapter 1).
func (p *Pool) estimate(st *state) fit {
	list := p.pairs(st)
	f := sum(list).regress(1)
	if f.n < leastFit || !f.strained(list) {
		return f
	}
	slope := p.robustSlope(list)
	off := p.sizes[:0]
	for _, v := range list {
		off = append(off, math.Abs(v.x-float64(slope*v.m)))
	}
	slices.Sort(off)
	p.sizes = off
	limit := trimmed * 1.4826 * middle(off)
	kept := list[:0]
	for _, v := range list {
		if math.Abs(v.x-float64(slope*v.m)) <= limit {
			kept = append(kept, v)
		}
	}
	return sum(kept).regress(1)
}

// strained says that a residual lies far off.
func (f *fit) strained(list []triple) bool {
	var most, all float64
	for i := range list {
		v := &list[i]
		e := v.x - f.shift - float64(f.slope*v.m) - float64(f.lag*v.l)
		e = float64(e * e)
		all += e
		if e > most {
			most = e
		}
	}
	return most*float64(len(list)) > farOff*farOff*all
}

// robustSlope is the slope of least absolute deviations through the origin: the median of x/m, weighted by |m|.
func (p *Pool) robustSlope(list []triple) float64 {
	said := p.says[:0]
	total := 0.0
	for _, v := range list {
		if v.m != 0 {
			said = append(said, implied{v.x / v.m, math.Abs(v.m)})
			total += math.Abs(v.m)
		}
	}
	p.says = said
	slices.SortFunc(said, byImplied)
	half := 0.0
	for _, v := range said {
		if half += v.dev; 2*half >= total {
			return v.m
		}
	}
	return 0
}

// regress is ordinary least squares, with the lag term where its t is beyond lagLine. The slope is held within its bounds; below span/4
// dates it leans to prior as if that had been seen on 5 dates more.
func (s moments) regress(prior float64) fit {
	f := fit{n: int(s.n)}
	if s.n < 5 {
		f.slope = prior
		return f
	}
	s.centre()
	f.mean, f.spread = s.m/s.n, s.mm
	if s.mm <= 0 || s.xx <= 0 {
		return f
	}
	lean := 0.0
	if s.n < span/4 {
		lean = 5 * s.mm / s.n
	}
	f.slope = (s.xm + float64(lean*prior)) / (s.mm + lean)
	rest := s.xx - 2*float64(f.slope*s.xm) + float64(f.slope*float64(f.slope*s.mm))
	if slope, lag, left, ok := s.withLag(); ok {
		f.slope, f.lag, rest = slope, lag, left
	}
	f.slope = min(max(f.slope, lowSlope), highSlope)
	f.shift = s.x/s.n - float64(f.slope*f.mean) - float64(f.lag*(s.l/s.n))
	f.explains = 1 - rest/s.xx
	return f
}

// withLag solves the two normal equations. ok is false where the lag's t does not pass its line.
func (s *moments) withLag() (slope, lag, rest float64, ok bool) {
	det := float64(s.mm*s.ll) - float64(s.ml*s.ml)
	if s.n < leastFit || det <= 1e-9*float64(s.mm*s.ll) {
		return 0, 0, 0, false
	}
	slope = (float64(s.ll*s.xm) - float64(s.ml*s.xl)) / det
	lag = (float64(s.mm*s.xl) - float64(s.ml*s.xm)) / det
	rest = max(s.xx-float64(slope*s.xm)-float64(lag*s.xl), 0)
	err := math.Sqrt(rest / (s.n - 3) * s.mm / det)
	return slope, lag, rest, math.Abs(lag) > lagLine*err
}

// refit estimates a series' fit anew. It is due on the first date of every other week, and on every date while there are
// few.
func (p *Pool) refit(i int) {
	st := &p.states[i]
	if p.members[i].Reference.Kind == None {
		return
	}
	few := st.fit.n < guard
	if !few && !p.newFortnight {
		return
	}
	st.fit = p.estimate(st)
	f := &st.fit
	f.use = f.n >= leastFit && f.explains >= leastExplains || f.n < leastFit && p.members[i].Reference.Kind == Series
}

// references finds today's return of every reference, NaN where there is none.
func (p *Pool) references() {
	for i := range p.members {
		lk, r := &p.looks[i], p.members[i].Reference
		lk.m = math.NaN()
		if r.Kind == Series && !p.states[r.Series].isOut {
			lk.m = p.looks[r.Series].x
		}
	}
	for g := range p.peers {
		p.medians(p.peers[g])
	}
}

// medians gives each member of a group the median of the others.
func (p *Pool) medians(group []int) {
	row := p.row[:0]
	for _, i := range group {
		if x := p.looks[i].x; x == x {
			row = append(row, ranked{x, i})
		}
	}
	p.row = row
	n := len(row)
	if n-1 < leastPeers {
		return
	}
	slices.SortFunc(row, byValue)
	for at, r := range row {
		if p.members[r.member].Reference.Kind == Peers {
			p.looks[r.member].m = medianWithout(row, at)
		}
	}
}

type ranked struct {
	x      float64
	member int
}

func byValue(a, b ranked) int {
	switch {
	case a.x < b.x:
		return -1
	case a.x > b.x:
		return 1
	}
	return a.member - b.member
}

// medianWithout is the median of an ascending row without the one at a place.
func medianWithout(row []ranked, at int) float64 {
	pick := func(k int) float64 {
		if k >= at {
			k++
		}
		return row[k].x
	}
	n := len(row) - 1
	return (pick((n-1)/2) + pick(n/2)) / 2
}
