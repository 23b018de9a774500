package rules

import (
	"fmt"
	"strings"
)

// FileDates is for which dates a file changes anything, held against the dates of its feed.
type FileDates struct {
	Dates    []Date // ascending
	New      []Date // of them, those on which nothing is held of the file's series
	Last     Date   // the newest that the feed brought before; NoDate when there is none
	Today    Date
	Style    string // the feed's, such as DD/MM/YYYY
	Whole    bool   // the file brings at least half of what the feed usually brings for a date
	Calendar *Calendar
}

const (
	ancientDays = 250 // business days that a single new date may lie behind the feed's newest: about a year
	ancientMost = 20  // dates; a file of more is a history
	soon        = 5   // business days after the newest date, within which the next file is expected
)

// RefuseDates refuses a file whose dates cannot be meant; nil when they can.
func RefuseDates(f FileDates) *Refusal {
	if len(f.Dates) == 0 || f.Last == NoDate {
		return nil
	}
	if r := f.swapped(); r != nil {
		return r
	}
	if n := len(f.New); n > 0 && n <= ancientMost && f.Calendar.Between(f.New[0], f.Last) > ancientDays {
		return &Refusal{Date: f.New[0], Why: fmt.Sprintf("it has values for %s, more than a year before the newest of this feed, %s",
			f.New[0].Day(), f.Last),
			Ask: "ask the provider for which date they are; accept the file if it is meant"}
	}
	return nil
}

// SwapDayMonth reads a date with day and month exchanged. ok is false when there is no such day.
func SwapDayMonth(d Date) (other Date, ok bool) {
	t := d.Time()
	return DateOf(t.Year(), t.Day(), int(t.Month()))
}

// swapped finds that day and month are the other way round than declared: most dates are none that the file could be for, and read the
// other way all of them are.
func (f *FileDates) swapped() *Refusal {
	if !f.Whole || !strings.Contains(f.Style, "DD") || !strings.Contains(f.Style, "MM") || strings.Contains(f.Style, "MMM") {
		return nil
	}
	newest, odd := NoDate, 0
	for _, d := range f.Dates {
		other, ok := SwapDayMonth(d)
		if !ok || other > f.Today+1 || !f.Calendar.Business(other) {
			return nil
		}
		newest = max(newest, other)
		if !f.plausible(d) {
			odd++
		}
	}
	if 2*odd <= len(f.Dates) || newest <= f.Last || f.Calendar.Between(f.Last, newest) > soon {
		return nil
	}
	last := f.Dates[len(f.Dates)-1]
	return &Refusal{Date: newest, Why: fmt.Sprintf("read as %s it is for %s; with day and month exchanged it is for %s, which follows the newest of this feed, %s",
		f.Style, last.Day(), newest.Day(), f.Last), Ask: "ask the provider how it writes dates, and set the feed's date style to it"}
}

// plausible says whether a date could be meant as it was read: a business day that follows soon on the newest, or a correction beside
// one that does.
func (f *FileDates) plausible(d Date) bool {
	newest := f.Dates[len(f.Dates)-1]
	return f.Calendar.Business(d) && newest > f.Last && f.Calendar.Between(f.Last, newest) <= soon
}

// ClosedDay is a date of a file that is no business day of some of its series.
type ClosedDay struct {
	Date     Date
	Series   Naming // those
	Calendar string // its name
}

// RefuseClosed is the refusal of a file with values on a day that is none of its series' business days.
func RefuseClosed(c *ClosedDay) *Refusal {
	return &Refusal{Date: c.Date, Why: fmt.Sprintf("%s is no business day under calendar %s, and it has values of %s: %s", c.Date.Day(), c.Calendar,
		Counted(c.Series.Count, "series"), &c.Series),
		Ask: "ask the provider for which day they are; if it is a business day of these series, name their calendar, or accept the file"}
}
