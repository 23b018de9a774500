package drill

import (
	"slices"

	"strayd/rules"
)

// Book is a matrix of returns with what is known of its series.
type Book struct {
	Dates  []rules.Date // ascending business days
	Series []Series
	Values [][]rules.Units // by date, then series; rules.Missing where there is none
	Events []rules.Event   // the calendar of distributions and splits that the reader of the book has
}

// Series is what is known of one series.
type Series struct {
	ID, Group, Feed string
	Reference       int  // index of the benchmark, -1 for none
	Peers           bool // held against the median of its group
	FX              int  // index of the series of its currency's return, -1 for none
	Helper          bool // a benchmark or currency, there for others: takes no plants but a wrong reference
	Tick            rules.Units
	Beta, Residual  float64 // of an invented series: slope and residual deviation, a fraction; 0 where not known
}

// Basis says what a series is held against: benchmark, peers or neither.
func (s *Series) Basis() string {
	switch {
	case s.Reference >= 0:
		return "benchmark"
	case s.Peers:
		return "peers"
	}
	return "neither"
}

// Fine says that a series prints more than two decimals of a per cent.
func (s *Series) Fine() bool { return s.Tick < hundredth }

// hundredth is the last digit of a return printed in per cent with two decimals.
const hundredth = rules.One / 10_000

// Clone copies a book: values and events, not what is known of the series.
func (b *Book) Clone() *Book {
	c := *b
	c.Values = make([][]rules.Units, len(b.Values))
	for t, row := range b.Values {
		c.Values[t] = slices.Clone(row)
	}
	c.Events = slices.Clone(b.Events)
	return &c
}

// Feeds lists the feeds that hold a series which takes plants, in the order of the book.
func (b *Book) Feeds() (out []string) {
	for i := range b.Series {
		if s := &b.Series[i]; !s.Helper && !slices.Contains(out, s.Feed) {
			out = append(out, s.Feed)
		}
	}
	return out
}

// of lists the series of a feed.
func (b *Book) of(feed string) (out []int) {
	for i := range b.Series {
		if b.Series[i].Feed == feed {
			out = append(out, i)
		}
	}
	return out
}

// followers lists the series that are held against a benchmark.
func (b *Book) followers(reference int) (out []int) {
	for i := range b.Series {
		if b.Series[i].Reference == reference {
			out = append(out, i)
		}
	}
	return out
}

// print rounds a return, a fraction, to what a series prints; ok is false when it does not fit.
func (s *Series) print(r float64) (u rules.Units, ok bool) {
	ticks := roundHalfAway(r * 1e15 / float64(s.Tick))
	if ticks*float64(s.Tick) > 9e17 || ticks*float64(s.Tick) < -9e17 { // 900, that is 90,000 %
		return rules.Missing, false
	}
	return rules.Units(ticks) * s.Tick, true
}
