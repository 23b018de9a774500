package rules

import (
	"math"
	"strings"
	"time"
)

// Finder says who found an error.
type Finder string

// The finders.
const (
	FoundByUs       Finder = "us"
	FoundByProvider Finder = "provider"
	FoundByClient   Finder = "client"
)

// finderOf goes by the decision's note, and by the provider's own restatement.
func finderOf(e *Entry, g *Flag) Finder {
	switch note := strings.ToLower(e.Note); {
	case strings.Contains(note, "found by client"):
		return FoundByClient
	case strings.Contains(note, "found by provider"), g != nil && g.Kind == KindRestated:
		return FoundByProvider
	}
	return FoundByUs
}

// Found is the record of the values that were decided to be wrong in the week.
type Found struct {
	Errors         []FoundError // by ref
	Sized          int          // those of which the size is known: corrected ones
	Material       int          // of those with a size and a figure of materiality, at it or above
	Below          int
	Unset          int // of those with a size, without a figure
	ToFlag, ToWord Num // median hours from arrival to the flag, and to the decision
	Timed          int // of how many values
}

// FoundError is one of them.
type FoundError struct {
	Flag
	Decision       Act
	Finder         Finder
	Size           Num       // by how much the value was wrong, as a fraction of the NAV
	Materiality    float64   // its group's figure, 0 where it has none
	Arrived        time.Time // zero where it is not known
	ToFlag, ToWord Num       // hours
}

// Material says that an error reaches its group's figure.
func (e *FoundError) Material() bool {
	return e.Size.OK && e.Materiality > 0 && e.Size.V >= e.Materiality
}

func (f *WeekFacts) found() (out Found) {
	last, byRef := f.lastDecisions(), f.byRef()
	var toFlag, toWord []float64
	for _, ref := range sortedRefs(last) {
		e, g := last[ref], byRef[ref]
		if g == nil || e.Conclusion == Genuine {
			continue
		}
		x := f.foundError(e, g)
		out.Errors = append(out.Errors, x)
		if x.ToFlag.OK {
			toFlag, toWord = append(toFlag, x.ToFlag.V), append(toWord, x.ToWord.V)
		}
		if !x.Size.OK {
			continue
		}
		switch out.Sized++; {
		case x.Materiality == 0:
			out.Unset++
		case x.Material():
			out.Material++
		default:
			out.Below++
		}
	}
	out.Timed = len(toFlag)
	out.ToFlag, out.ToWord = median(toFlag), median(toWord)
	return out
}

func (f *WeekFacts) foundError(e *Entry, g *Flag) FoundError {
	x := FoundError{Flag: *g, Decision: e.Act, Finder: finderOf(e, g), Materiality: f.group(g.Group).Materiality, Arrived: f.Arrived[g.Ref]}
	if e.Conclusion == Corrected && g.Return != Missing {
		x.Size = Some(math.Abs(g.Return.Float() - e.Value.Float()))
	}
	if !x.Arrived.IsZero() {
		x.ToFlag, x.ToWord = Some(g.RaisedAt.Sub(x.Arrived).Hours()), Some(e.At.Sub(x.Arrived).Hours())
	}
	return x
}

// lastDecisions are the decisions of the week by ref; of several about one flag the last.
func (f *WeekFacts) lastDecisions() map[uint64]*Entry {
	last := map[uint64]*Entry{}
	for i := range f.Acts {
		if e := &f.Acts[i]; e.Deed == Decide && f.Span.During(e.At) {
			for _, ref := range e.Refs {
				last[ref] = e
			}
		}
	}
	return last
}
