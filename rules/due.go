package rules

import "time"

// AddWeekdays is the n-th day from Monday to Friday after d; for n = 0 it is d, or the Monday after it when d is at a weekend.
func AddWeekdays(d Date, n int) Date { return (*Calendar)(nil).Add(d, n) }

// DueAt is when a valuation date falls due: at the time of day of d, that many business days after the date, in the zone. A
// time of day that the zone skips is the first instant after it, one that it shows twice the first of the two.
func DueAt(d Due, date Date, zone *time.Location) time.Time {
	return Instant(d.Calendar.Add(date, d.Days).Time().Add(time.Duration(d.Minutes)*time.Minute), zone)
}

// DueBetween lists the valuation dates, business days, that fall due after one time and no later than another. What was
// looked at up to a time is looked at on from there: no date is left out or listed twice.
func DueBetween(d Due, after, upto time.Time, zone *time.Location) (dates []Date) {
	if !after.Before(upto) {
		return nil
	}
	// No zone shifts a time of day by more than a day, so the first that can fall due is the one due a day earlier.
	day := d.Calendar.Add(DateFrom(after.In(zone))-1, 0)
	for date := d.Calendar.Add(day, -d.Days); ; date = d.Calendar.Add(date, 1) {
		switch at := DueAt(d, date, zone); {
		case at.After(upto):
			return dates
		case at.After(after):
			dates = append(dates, date)
		}
	}
}

// NextDue is the first valuation date that falls due after a time, and when it does.
func NextDue(d Due, after time.Time, zone *time.Location) (Date, time.Time) {
	day := d.Calendar.Add(DateFrom(after.In(zone))-1, 0)
	for date := d.Calendar.Add(day, -d.Days); ; date = d.Calendar.Add(date, 1) {
		if at := DueAt(d, date, zone); at.After(after) {
			return date, at
		}
	}
}

// Instant is when the clock on the wall of a zone first shows a civil time, which is written as if it were UTC; or the first
// instant after it, when the clock never shows it.
func Instant(civil time.Time, zone *time.Location) time.Time {
	t := civil.Add(-widest).In(zone)
	for {
		_, offset := t.Zone()
		start, end := t.ZoneBounds()
		at := civil.Add(-time.Duration(offset) * time.Second).In(zone)
		if at.Before(start) {
			return start
		}
		if end.IsZero() || at.Before(end) {
			return at
		}
		t = end
	}
}

// widest is more than any zone's distance from UTC.
const widest = 36 * time.Hour
