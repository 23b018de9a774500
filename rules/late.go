package rules

import (
	"fmt"
	"time"
)

// Arrival is what a feed gave for a valuation date by the time at which the date fell due. Expected are the series that it gave
// on its date before; where it gave none, any value makes it whole.
type Arrival struct {
	Feed    string
	Date    Date
	Due     time.Time
	Came    int    // expected series that have a value
	Others  int    // series that have a value and were not expected
	Refused string // name of a refused file of the date, "" when there is none

	missed Naming
}

// Miss counts an expected series that has no value.
func (a *Arrival) Miss(series string) { a.missed.Add(series) }

// Completeness is how much of a feed is there for a date.
type Completeness string

const (
	Whole   Completeness = "whole"
	Partial Completeness = "partial"
	Late    Completeness = "late" // nothing came
)

// Completeness is how much came.
func (a *Arrival) Completeness() Completeness {
	switch {
	case a.Came+a.Others == 0:
		return Late
	case a.missed.Count > 0:
		return Partial
	}
	return Whole
}

// Flag is the flag of an arrival that is not whole; ok is false when it is. There is one a feed and date.
func (a *Arrival) Flag(now time.Time) (f Flag, ok bool) {
	if a.Completeness() == Whole {
		return Flag{}, false
	}
	return Flag{RaisedAt: now, Date: a.Date, Kind: KindLate, Return: Missing, Standing: Open, Feed: a.Feed, Note: a.note()}, true
}

func (a *Arrival) note() string {
	by := a.Due.Format("2006-01-02 15:04 -07:00")
	var note string
	switch expected := a.Came + a.missed.Count; {
	case expected == 0:
		note = fmt.Sprintf("nothing came by %s, and no date of this feed is held to say which series to expect", by)
	case a.Completeness() == Late:
		note = fmt.Sprintf("nothing came by %s; expected %d series: %s", by, expected, &a.missed)
	default:
		note = fmt.Sprintf("no value of %d of %d expected series by %s: %s", a.missed.Count, expected, by, &a.missed)
	}
	if a.Refused != "" {
		note += "; " + a.Refused + " was refused"
	}
	return note
}
