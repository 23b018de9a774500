package drill

import (
	"slices"

	"strayd/rules"
)

// Promise is what a line of the settings promises: the share of ordinary values beyond it.
type Promise struct {
	Name  string
	Kinds []rules.Kind
	Range string // "" for any
	Share float64
	// Judges says whether the line judges a series; nil for all.
	Judges func(*Series) bool
}

// Quiet is what a line did on untouched days.
type Quiet struct {
	Name     string
	Values   int // values of series that take plants, on untouched days
	Flags    int
	Promised float64 // flags
}

// Untouched counts flags on untouched days against what the lines promise. A day of a series is untouched when no plant holds it, and
// none did within the five days before; of a series that is held against a benchmark, also when that was not wrong on the day.
func Untouched(b *Book, p *Plan, flags []Flag, promises []Promise) []Quiet {
	u := untouched(b, p)
	s := newScorer(b, flags)
	var out []Quiet
	for _, promise := range promises {
		values := judgedValues(b, u, promise.Judges)
		q := Quiet{Name: promise.Name, Values: values, Promised: promise.Share * float64(values)}
		for i := range s.flags {
			if s.falseUnder(u, &s.flags[i], &promise) {
				q.Flags++
			}
		}
		out = append(out, q)
	}
	return out
}

func judgedValues(b *Book, u [][]bool, judges func(*Series) bool) (n int) {
	for s := range b.Series {
		if judges != nil && !judges(&b.Series[s]) {
			continue
		}
		for t := range b.Dates {
			if u[t][s] && b.Values[t][s] != rules.Missing {
				n++
			}
		}
	}
	return n
}

func (s *scorer) falseUnder(u [][]bool, f *Flag, p *Promise) bool {
	i, known := s.index[f.Series]
	t, dated := s.at[f.Date]
	return known && dated && u[t][i] && slices.Contains(p.Kinds, f.Kind) && (p.Range == "" || p.Range == f.Range)
}

// untouched is, by date and series, whether nothing planted shows there. Helpers and dates before the drill do not count.
func untouched(b *Book, p *Plan) [][]bool {
	u := make([][]bool, len(b.Dates))
	for t := range u {
		u[t] = make([]bool, len(b.Series))
		for s := range u[t] {
			u[t][s] = t >= p.From && !b.Series[s].Helper
		}
	}
	for i := range p.Plants {
		q := &p.Plants[i]
		for s := range b.Series {
			switch {
			case q.holds(b, s):
				touch(u, s, q.At, q.last()+inTime)
			case q.Kind == ReferenceBad && b.Series[s].Reference == q.Series:
				touch(u, s, q.At, q.last())
			}
		}
	}
	return u
}

func touch(u [][]bool, s, from, to int) {
	for t := from; t <= to && t < len(u); t++ {
		u[t][s] = false
	}
}

// RefusedUntouched counts files refused on dates on which nothing is planted in their feed, of how many files.
func RefusedUntouched(b *Book, p *Plan, flags []Flag) (refused, files int) {
	s := newScorer(b, flags)
	for _, feed := range b.Feeds() {
		hit := make([]bool, len(b.Dates))
		for i := range p.Plants {
			if q := &p.Plants[i]; q.Series < 0 && q.Feed == feed {
				for t := q.At; t <= q.last()+1 && t < len(hit); t++ {
					hit[t] = true
				}
			}
		}
		for t := p.From; t < len(hit); t++ {
			if !hit[t] {
				files++
			}
		}
		for _, n := range s.feeds[feed] {
			if t, ok := s.at[s.flags[n].Date]; ok && t >= p.From && !hit[t] && s.flags[n].Kind == rules.KindRefused {
				refused++
			}
		}
	}
	return refused, files
}
