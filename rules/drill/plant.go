package drill

import (
	"slices"

	"strayd/rules"
)

// Plant is one error, or true move, at one place.
type Plant struct {
	Kind    Kind
	Series  int    // index in the book, -1 for a whole feed
	Partner int    // of a swapped pair, -1 for none
	Feed    string // that the values come by
	At      int    // index of the first date
	Days    int
	Left    float64 // residual deviations that it leaves on the day when it shows, 0 where there is no reference
	Cells   []Cell  // the values that it puts
	Listed  []rules.Event
	Keep    float64 // share of the rows that a truncated file keeps
	Torn    bool    // and its last row breaks off
}

// Cell is one value of the matrix.
type Cell struct {
	At, Series int
	Value      rules.Units
}

// shows is the index of the first date on which it can be seen.
func (p *Plant) shows() int { return p.At + natureOf(p.Kind).from }

// last is the index of its last date.
func (p *Plant) last() int { return p.At + p.Days - 1 }

// holds says whether the plant is about a series of the book.
func (p *Plant) holds(b *Book, series int) bool {
	if p.Series < 0 {
		return b.Series[series].Feed == p.Feed
	}
	return series == p.Series || series == p.Partner
}

// Plan is all plants of a run.
type Plan struct {
	Seed   uint64
	From   int // index of the first date that may hold a plant
	Plants []Plant
}

// Apply gives a copy of the book with the plants in it.
func (p *Plan) Apply(b *Book) *Book {
	out := b.Clone()
	for i := range p.Plants {
		for _, c := range p.Plants[i].Cells {
			out.Values[c.At][c.Series] = c.Value
		}
		out.Events = append(out.Events, p.Plants[i].Listed...)
	}
	slices.SortStableFunc(out.Events, func(a, b rules.Event) int { return int(a.Date) - int(b.Date) })
	return out
}

// File gives the plant of a feed's file as such on a date, nil when there is none: its kind is TruncatedFile, MissingFile or LateFile.
func (p *Plan) File(feed string, at int) *Plant {
	for i := range p.Plants {
		if q := &p.Plants[i]; q.Feed == feed && q.At == at && natureOf(q.Kind).scope == fileItself {
			return q
		}
	}
	return nil
}

// Lasts says that a plant takes the whole file of a feed on a date as one of several days, so that the sender goes on sending it.
func (p *Plan) Lasts(feed string, at int) bool {
	for i := range p.Plants {
		if q := &p.Plants[i]; q.Series < 0 && q.Feed == feed && q.Lasting() && q.At <= at && at <= q.last() {
			return true
		}
	}
	return false
}
