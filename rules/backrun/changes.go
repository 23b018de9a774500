package backrun

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// Turn says what becomes of a value, or a market day, from the first side to the second.
type Turn string

// The turns.
const (
	Appears  Turn = "appears"
	Vanishes Turn = "vanishes"
	Turns    Turn = "other kind" // both flag it, as another kind
)

// Change is one that the two sides do not flag alike.
type Change struct {
	Turn   Turn
	Flag   rules.Flag  // that of the side that has it; of both the second's
	Before rules.Kind  // of Turns: the first's kind
	Issued *rules.Flag // that the ledger has about the same, nil for none; a decided one before others
}

// Changes lists what the sides do not flag alike, by date, then what it is about; none where there is one side. kept counts what both flag.
func (c *Comparison) Changes() (out []Change, kept int) {
	if len(c.Sides) < 2 {
		return nil, 0
	}
	these, other, issued := c.Sides[0].flagged(), c.Sides[1].flagged(), c.issued()
	for at, f := range other {
		switch old := these[at]; {
		case old == nil:
			out = append(out, Change{Turn: Appears, Flag: *f, Issued: issued[at]})
		case old.Kind != f.Kind:
			out = append(out, Change{Turn: Turns, Flag: *f, Before: old.Kind, Issued: issued[at]})
			kept++
		default:
			kept++
		}
	}
	for at, f := range these {
		if other[at] == nil {
			out = append(out, Change{Turn: Vanishes, Flag: *f, Issued: issued[at]})
		}
	}
	slices.SortFunc(out, func(a, b Change) int {
		return cmp.Or(cmp.Compare(a.Flag.Date, b.Flag.Date), cmp.Compare(a.Flag.Series, b.Flag.Series), cmp.Compare(a.Flag.Group, b.Flag.Group))
	})
	return out, kept
}

// issued are the ledger's flags of the compared dates and kinds, and those of restated values that were decided.
func (c *Comparison) issued() map[subject]*rules.Flag {
	out := map[subject]*rules.Flag{}
	for i := range c.Issued {
		f := &c.Issued[i]
		about := slices.Contains(Kinds, f.Kind) || f.Kind == rules.KindRestated && f.Decided != nil
		if _, in := slices.BinarySearch(c.Dates, f.Date); !in || !about {
			continue
		}
		if old := out[subjectOf(f)]; old == nil || old.Decided == nil && f.Decided != nil {
			out[subjectOf(f)] = f
		}
	}
	return out
}

// Decision counts what was decided one way in the past, and how many of it each side flags.
type Decision struct {
	Conclusion   rules.Conclusion
	Decided      int
	Flagged      []int // by side
	Gained, Lost int   // flagged by the second side only, by the first only
}

// Decisions counts the decisions about the compared dates: one a series, or group, and date.
func (c *Comparison) Decisions() (out []Decision) {
	issued := c.issued()
	flagged := make([]map[subject]*rules.Flag, len(c.Sides))
	for n, s := range c.Sides {
		flagged[n] = s.flagged()
	}
	for _, word := range rules.Conclusions {
		d := Decision{Conclusion: word, Flagged: make([]int, len(c.Sides))}
		for at, f := range issued {
			if f.Decided == nil || f.Decided.Conclusion != word {
				continue
			}
			d.Decided++
			for n := range flagged {
				if flagged[n][at] != nil {
					d.Flagged[n]++
				}
			}
			if len(flagged) == 2 && flagged[0][at] == nil && flagged[1][at] != nil {
				d.Gained++
			}
			if len(flagged) == 2 && flagged[0][at] != nil && flagged[1][at] == nil {
				d.Lost++
			}
		}
		out = append(out, d)
	}
	return out
}

// Balance sums decisions up for and against the second side, where what matters is wrong values: for it are wrong ones that it alone flags
// and genuine ones that it no longer does, against it the reverse.
func Balance(all []Decision) (pro, con int) {
	for _, d := range all {
		if d.Conclusion == rules.Genuine {
			pro, con = pro+d.Lost, con+d.Gained
		} else {
			pro, con = pro+d.Gained, con+d.Lost
		}
	}
	return pro, con
}
