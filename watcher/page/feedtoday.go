package page

import (
	"time"

	"strayd/rules"
)

// feedToday is one feed on the first page.
type feedToday struct {
	Name    string
	File    string
	At      time.Time
	Date    rules.Date
	Refused int
	Whole   bool // the date that fell due last has come
	Due     string
}

// zoneOf is the zone of a deadline.
func zoneOf(d *rules.Due, otherwise *time.Location) *time.Location {
	if zone, err := time.LoadLocation(d.Timezone); err == nil && d.Timezone != "" {
		return zone
	}
	return otherwise
}

func feedOf(f *rules.Feed, a *arrival, now time.Time, zone *time.Location) feedToday {
	out := feedToday{Name: f.Name, Date: rules.NoDate, Whole: true}
	if a != nil {
		out.File, out.At, out.Date, out.Refused = a.file.File.Name, a.file.Received, a.file.Last, a.refused
		if out.File == "" {
			out.Date = rules.NoDate
		}
	}
	if f.Due == nil {
		return out
	}
	at := zoneOf(f.Due, zone)
	next, when := rules.NextDue(*f.Due, now, at)
	last := lastDue(f.Due, now, at)
	out.Whole = out.Date >= last
	switch {
	case !out.Whole:
		out.Due = last.Day() + " is overdue since " + rules.DueAt(*f.Due, last, at).In(zone).Format("Mon 15:04")
	case out.Date >= next:
		out.Due = next.Day() + " is here"
	default:
		out.Due = next.Day() + " is due " + when.In(zone).Format("Mon 15:04")
	}
	return out
}

// lastDue is the date that fell due last.
func lastDue(d *rules.Due, now time.Time, zone *time.Location) rules.Date {
	dates := rules.DueBetween(*d, now.AddDate(0, 0, -14), now, zone)
	if len(dates) == 0 {
		return rules.NoDate
	}
	return dates[len(dates)-1]
}
