// Package backrun says what two sets of settings make of one past, side by side: a side is what one of them concluded, a change a value
// that only one of them flags, the advice the lines that keep to a budget of flags. A back-run looks at a past that is known, under lines
// that may have been chosen on it: its figures are in-sample, and the advice says how far they reach beyond.
package backrun

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// Side is what one set of settings concluded of the dates that are compared.
type Side struct {
	Settings rules.Settings
	Flags    []rules.Flag  // by date, then series
	Covers   []rules.Cover // by range in the settings' order, then group
	Tails    []Tail        // see SortTails
	Widest   float64       // tails below it are all there
}

// Tail is the smallest tail that the estimated ranges gave a value.
type Tail struct {
	Level  float64
	Date   int // index among the dates compared
	Series uint32
	Always bool // what the value looks like is doubted: it is flagged wherever the line lies
	Breach bool // it is beyond the line of the side
}

// SortTails puts the smallest first.
func (s *Side) SortTails() {
	slices.SortFunc(s.Tails, func(a, b Tail) int {
		return cmp.Or(cmp.Compare(a.Level, b.Level), cmp.Compare(a.Date, b.Date), cmp.Compare(a.Series, b.Series))
	})
}
