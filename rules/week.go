package rules

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"
)

// WeekSpan is one week of the weekly log: the valuation dates from a Monday to the Sunday after, the time between their midnights, and the
// moment whose knowledge counts.
type WeekSpan struct {
	Monday     Date
	Start, End time.Time // midnights in the zone
	AsOf       time.Time // nothing that became known later is told
}

// weekRest is how long after its end a week still takes what becomes known: to the end of the Monday after. From then on its log is the
// same whenever it is made.
const weekRest = 24 * time.Hour

// NewWeekSpan is the week of a Monday as of a moment; no later than the end of the Monday after.
func NewWeekSpan(monday Date, now time.Time, zone *time.Location) WeekSpan {
	s := WeekSpan{Monday: monday, Start: Instant(monday.Time(), zone), End: Instant((monday + 7).Time(), zone)}
	s.AsOf = now
	if last := s.End.Add(weekRest); now.After(last) {
		s.AsOf = last
	}
	return s
}

// WeekNow is the Monday of the newest week of which more than half is over: on a Monday morning the week before, on a Friday evening
// the one that ends.
func WeekNow(now time.Time, zone *time.Location) Date {
	return MondayOf(DateFrom(now.Add(-84 * time.Hour).In(zone)))
}

// MondayOf is the Monday on or before a date.
func MondayOf(d Date) Date { return d - Date((int(d.Weekday())+6)%7) }

// Before is the week before, as it was known a week earlier.
func (s WeekSpan) Before(zone *time.Location) WeekSpan {
	b := NewWeekSpan(s.Monday-7, s.AsOf, zone)
	b.AsOf = Instant(civilOf(s.AsOf.In(zone)).AddDate(0, 0, -7), zone)
	return b
}

// civilOf writes the time on the wall as if it were UTC.
func civilOf(t time.Time) time.Time {
	y, m, d := t.Date()
	return time.Date(y, m, d, t.Hour(), t.Minute(), t.Second(), t.Nanosecond(), time.UTC)
}

// Sunday is the last date of the week.
func (s WeekSpan) Sunday() Date { return s.Monday + 6 }

// Has says whether a valuation date is in the week.
func (s WeekSpan) Has(d Date) bool { return d >= s.Monday && d <= s.Sunday() }

// During says whether something happened in the week and was known at AsOf.
func (s WeekSpan) During(t time.Time) bool {
	return !t.Before(s.Start) && t.Before(s.End) && !t.After(s.AsOf)
}

// Name is the week after ISO 8601: "2026-W11".
func (s WeekSpan) Name() string { return WeekName(s.Monday) }

// WeekName is the name of the week of a date after ISO 8601.
func WeekName(d Date) string {
	year, week := d.Time().ISOWeek()
	return fmt.Sprintf("%04d-W%02d", year, week)
}

// ParseWeek reads a week, "2026-W11", or any date in it, and gives its Monday.
func ParseWeek(s string) (Date, error) {
	wrong := fmt.Errorf("week %q: need one such as 2026-W11, or a date in it", s)
	year, week, ok := strings.Cut(strings.ToUpper(s), "-W")
	if !ok {
		d, err := ParseDate(s)
		if err != nil {
			return NoDate, wrong
		}
		return MondayOf(d), nil
	}
	y, errYear := strconv.Atoi(year)
	w, errWeek := strconv.Atoi(week)
	if errYear != nil || errWeek != nil || len(year) != 4 || len(week) != 2 || strings.Trim(year+week, "0123456789") != "" {
		return NoDate, wrong
	}
	fourth, _ := DateOf(y, 1, 4) // ISO 8601: always in week 1
	monday := MondayOf(fourth) + Date(7*(w-1))
	if got, _ := monday.Time().ISOWeek(); got != y {
		return NoDate, wrong
	}
	return monday, nil
}

// WeekFacts are the plain inputs of one week's figures: what the ledger and the configuration say, as known at Span.AsOf.
type WeekFacts struct {
	Span     WeekSpan
	Zone     *time.Location
	Calendar *Calendar
	Groups   []Group
	Owner    func(series string) string // nil without a register
	Feeds    []Feed
	Flags    []Flag                  // each as it stood then, by ref; those of history left out
	Acts     []Entry                 // decisions of the record, oldest first
	Changes  []Change                // of settings, in the week
	Files    []WeekFile              // accepted and refused
	Passes   []WeekPass              // that ended in the week
	Due      int                     // passes that the schedule had in the week; 0 where it has none
	Notices  []WeekNotice            // made in the week
	Days     []WeekDay               // business days of the week that were over
	Covers   []Cover                 // by range, then group
	Restated map[string]Restatements // by feed: values of which the week brought another version
	Arrived  map[uint64]time.Time    // by ref, of flags decided to be wrong in the week: when the value came that the flag is about
	Thin     Thin
	Settings uint32 // number of those in force
	Head     string // of the record
}

// WeekDay is how many series of a business day have a value, of those that had one on the date before, over all and by feed.
type WeekDay struct {
	Date Date
	Portion
	Feeds map[string]Portion
}

// Portion is a part of a whole.
type Portion struct{ Part, Whole int }

// Add sums two portions.
func (p *Portion) Add(o Portion) { p.Part, p.Whole = p.Part+o.Part, p.Whole+o.Whole }

// WeekFile is what a week's figures need of one file.
type WeekFile struct {
	Feed           string
	At             time.Time
	Last           Date // its newest valuation date
	Refused        bool
	Rows, Restated int
}

// WeekPass is one pass.
type WeekPass struct {
	Started, Ended time.Time
	Failed         bool
}

// WeekNotice is one message.
type WeekNotice struct{ State NoticeState }

// Restatements sums up the restated values of one feed.
type Restatements struct {
	Count   int
	Largest float64 // as a size, a fraction
	Oldest  Date    // NoDate when there is none
}

// Add counts one restated value.
func (r *Restatements) Add(d Date, old, now Units) {
	if r.Count++; r.Count == 1 || d < r.Oldest {
		r.Oldest = d
	}
	r.Largest = max(r.Largest, math.Abs(now.Float()-old.Float()))
}

// Thin counts the series that ranges say little or nothing of, at the end of a week.
type Thin struct {
	Series      int    // that have a value in the week
	Provisional Naming // under 20 observations
	Unjudged    Naming // too few for any verdict, or a deviation of 0
	Dormant     Naming // no value for longer than DormantAfter, up to the end of the week
	Zero        Naming // nothing but zeros in the week, three values at least
}

// Change is one change of the recorded settings.
type Change struct {
	Number  uint32
	At      time.Time
	Who     string
	What    []string // in words, at most a few
	BackRun []BackRun
}

// BackRun holds the flags that a range would have raised over the dates before a change, under the settings before and after.
type BackRun struct {
	Range                 string // "" for the flags of every kind together, of the values that there are
	Dates                 int
	JudgedOld, BeyondOld  int
	JudgedNew, BeyondNew  int
	HeldBefore, HeldAfter bool // the range is there under the settings before, and after
}
