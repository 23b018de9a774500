package rules

import (
	"fmt"
	"slices"
)

// Delivery is a file of a feed held against the feed's files before it.
type Delivery struct {
	Date     Date    // its newest
	Expected int     // series that the files before brought regularly and that should have a value on the date
	Missing  Naming  // of them, those that have none
	Tail     bool    // they are all that usually follow the last one that came
	Whole    bool    // and they are those of whole groups
	Chance   float64 // that all of them are missing by themselves, by how often each was before
	Last     string  // that one
	Idle     bool    // the file changes nothing
	Rows     int
	Before   []int // rows of the files before
}

const (
	// DeliveryFiles is how many files before say what is expected.
	DeliveryFiles = 20
	// leastFiles is how many it takes.
	leastFiles = 5
	// cutShort is the share of the usual rows below which a file that breaks off is refused.
	cutShort = 0.95
	// cutChance is how likely it may be that so many of the last series are missing by themselves: below one in 5,000.
	cutChance = 1e-4
	// steadyRows is how far the rows of the files before may lie from their median for it to be called usual.
	steadyRows = 0.1
)

// Regular says whether a series that came in so many of the last files is expected in the next: in four of five.
func Regular(came, files int) bool { return files >= leastFiles && 5*came >= 4*files }

// Absence is how likely a series that came in so many of the last files is missing in the next (Jeffreys' estimate of a share).
func Absence(came, files int) float64 {
	return (float64(max(0, files-came)) + 0.5) / (float64(files) + 1)
}

// Refuse refuses a file that breaks off; nil when it does not. Series that are missing here and there do not refuse it, nor do whole groups: a
// holiday of theirs looks so.
func (d *Delivery) Refuse() *Refusal {
	ask := "ask the provider to send it whole; accept the file if this is all there is"
	if n := d.Missing.Count; d.Tail && !d.Whole && d.Chance < cutChance && float64(d.Expected-n) < cutShort*float64(d.Expected) {
		return &Refusal{Date: d.Date,
			Why: fmt.Sprintf("it breaks off after %s: %d of %d expected series, all that usually follow, are not in it: %s", d.Last, n, d.Expected, &d.Missing), Ask: ask}
	}
	usual, steady := d.usualRows()
	if steady && d.Idle && float64(d.Rows) < cutShort*usual { // such as one of several dates whose newest is cut off
		return &Refusal{Date: d.Date, Why: fmt.Sprintf("it has %s, the files before had %.0f: it is cut short", Counted(d.Rows, "row"), usual), Ask: ask}
	}
	return nil
}

// usualRows is the median of the rows of the files before; steady says whether they all lie near it.
func (d *Delivery) usualRows() (usual float64, steady bool) {
	rows := slices.Sorted(slices.Values(d.Before))
	n := len(rows)
	if n < leastFiles {
		return 0, false
	}
	usual = float64(rows[(n-1)/2]+rows[n/2]) / 2
	return usual, float64(rows[0]) >= (1-steadyRows)*usual && float64(rows[n-1]) <= (1+steadyRows)*usual
}

// Note says who is missing, "" when nobody is.
func (d *Delivery) Note() string {
	if d.Missing.Count == 0 {
		return ""
	}
	return fmt.Sprintf("no value of %d of %d expected series: %s; ask the provider whether they come later; of those that ended, give the end in the register",
		d.Missing.Count, d.Expected, &d.Missing)
}

// SkippedNote says that a date was passed over.
func SkippedNote(absent *Naming) string {
	return fmt.Sprintf("no file brought anything of the %d expected series: %s; ask the provider for the day; if it was a holiday, name it in the calendar",
		absent.Count, absent)
}

// RefuseUnended is the refusal of a file that stops within its last line.
func RefuseUnended(date Date) *Refusal {
	return &Refusal{Date: date, Why: "its last line does not end, as those of the files before did: it breaks off",
		Ask: "ask the provider to send it whole; accept the file if this is all there is"}
}
