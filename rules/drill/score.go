package drill

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// Flag is what the scoring needs of a flag.
type Flag struct {
	Date      rules.Date // valuation date
	Raised    rules.Date // valuation date of the pass that raised it
	Series    string     // "" where the flag is not about one series
	Group     string
	Feed      string
	Kind      rules.Kind
	Range     string // of a breach
	LooksLike rules.Cause
}

// Naming is what became of the cause.
type Naming uint8

const (
	Unnamed Naming = iota
	Right
	Wrong
)

// Outcome is what the flags made of a plant.
type Outcome struct {
	*Plant
	Within   int         // business days from the first date on which it shows to the first flag about it; -1 when there is none in time
	Named    rules.Cause // of the newest flag about it that names one
	Naming   Naming
	Flags    int // about the plant and, for whole files, about anything of the feed on its dates
	Followed int // of a wrong benchmark: flags on the series that are held against it
}

// inTime is how many business days a plant has to be caught in.
const inTime = 5

// SameDay says that a plant was caught on the day when it shows; a spike by the day on which it is taken back.
func (o *Outcome) SameDay() bool {
	n := natureOf(o.Kind)
	days := 0
	if !o.Lasting() {
		days = n.upto - n.from
	}
	return o.Within >= 0 && o.Within <= days
}

// Lasting says that the kind of the plant shows over days.
func (p *Plant) Lasting() bool { return p.Kind.Lasting() }

// FiveDays says that a plant was caught within five days.
func (o *Outcome) FiveDays() bool { return o.Within >= 0 }

// scorer finds flags by series and by feed.
type scorer struct {
	book  *Book
	at    map[rules.Date]int
	index map[string]int
	flags []Flag
	by    [][]int          // by series of the book: indexes of flags, by date
	feeds map[string][]int // flags about no series
	// refused says on which dates a file of a feed was refused: flags on series of it are then about the file that was sent again.
	refused map[fileKey]bool
}

// fileKey is a feed on a date.
type fileKey struct {
	feed string
	date rules.Date
}

func newScorer(b *Book, flags []Flag) *scorer {
	s := &scorer{book: b, at: map[rules.Date]int{}, index: map[string]int{}, by: make([][]int, len(b.Series)), feeds: map[string][]int{},
		refused: map[fileKey]bool{}}
	for t, d := range b.Dates {
		s.at[d] = t
	}
	for i := range b.Series {
		s.index[b.Series[i].ID] = i
	}
	s.flags = slices.Clone(flags)
	slices.SortStableFunc(s.flags, func(a, b Flag) int { return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Raised, b.Raised)) })
	for n := range s.flags {
		f := &s.flags[n]
		if i, ok := s.index[f.Series]; ok {
			s.by[i] = append(s.by[i], n)
		} else if f.Series == "" {
			s.feeds[f.Feed] = append(s.feeds[f.Feed], n)
			s.refused[fileKey{f.Feed, f.Date}] = s.refused[fileKey{f.Feed, f.Date}] || f.Kind == rules.KindRefused
		}
	}
	return s
}

// Outcomes scores the plants of a plan.
func Outcomes(b *Book, p *Plan, flags []Flag) []Outcome {
	s := newScorer(b, flags)
	out := make([]Outcome, len(p.Plants))
	for i := range p.Plants {
		out[i] = s.outcome(&p.Plants[i])
	}
	return out
}

func (s *scorer) outcome(p *Plant) Outcome {
	o := Outcome{Plant: p, Within: -1}
	for _, n := range s.about(p) {
		s.take(&o, &s.flags[n])
	}
	if n := natureOf(p.Kind); len(n.right) > 0 && o.FiveDays() {
		switch {
		case slices.Contains(n.right, o.Named):
			o.Naming = Right
		case o.Named != "":
			o.Naming = Wrong
		}
	}
	if p.Kind == ReferenceBad {
		for _, f := range s.book.followers(p.Series) {
			o.Followed += s.count(s.by[f], p.At, p.At)
		}
	}
	return o
}

// about lists the flags that may be about a plant, by date.
func (s *scorer) about(p *Plant) (out []int) {
	if p.Series >= 0 {
		out = append(out, s.by[p.Series]...)
		if p.Partner >= 0 {
			out = append(out, s.by[p.Partner]...)
		}
	} else {
		out = append(out, s.feeds[p.Feed]...)
		for _, i := range s.book.of(p.Feed) {
			out = append(out, s.by[i]...)
		}
	}
	slices.Sort(out)
	return out
}

// take counts a flag for a plant when it is about it: on the dates on which the plant shows, or within five days for a row.
func (s *scorer) take(o *Outcome, f *Flag) {
	t, ok := s.at[f.Date]
	from, last := o.shows(), o.shows()+inTime-1
	if o.Series < 0 {
		last = o.last()
	}
	if !ok || t < from || t > last || !s.counts(o.Plant, f) {
		return
	}
	if raised, ok := s.at[f.Raised]; ok {
		t = max(t, raised)
	}
	o.Flags++
	if within := t - from; within < inTime && (o.Within < 0 || within < o.Within) {
		o.Within = within
	}
	if f.LooksLike != "" && s.at[f.Date] <= o.last() {
		o.Named = f.LooksLike
	}
}

// counts says whether a flag of this kind can be about a plant.
func (s *scorer) counts(p *Plant, f *Flag) bool {
	switch f.Kind {
	case rules.KindRestated, rules.KindMarketDay, rules.KindDrift, rules.KindVolatility, rules.KindMisfit:
		return false
	case rules.KindMissing, rules.KindLate, rules.KindRefused:
		return p.Series < 0
	}
	return p.Series >= 0 || natureOf(p.Kind).scope == wholeFeed && !s.refused[fileKey{p.Feed, f.Date}]
}

// count is how many flags of a list lie between two dates.
func (s *scorer) count(list []int, from, to int) (n int) {
	for _, i := range list {
		if t, ok := s.at[s.flags[i].Date]; ok && from <= t && t <= to {
			n++
		}
	}
	return n
}
