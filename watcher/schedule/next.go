package schedule

import (
	"sort"
	"time"

	"strayd/rules"
)

// Next is the first run after t, in the schedule's zone. It is the zero time only for the zero Schedule.
func (s Schedule) Next(t time.Time) time.Time {
	switch {
	case s.every > 0:
		return t.Truncate(s.every).Add(s.every).In(s.zone)
	case s.match == nil:
		return time.Time{}
	case !s.civil:
		return s.nextReal(t)
	case !s.real:
		return s.nextCivil(t)
	}
	return earlier(s.nextCivil(t), s.nextReal(t))
}

// Upcoming is the first n runs after from.
func (s Schedule) Upcoming(from time.Time, n int) []time.Time {
	var runs []time.Time
	for t := s.Next(from); len(runs) < n && !t.IsZero(); t = s.Next(t) {
		runs = append(runs, t)
	}
	return runs
}

// nextCivil finds the next matching civil time whose instant lies after t.
func (s Schedule) nextCivil(t time.Time) time.Time {
	civil := wall(t, s.zone)
	for {
		civil = s.search(civil)
		if at := rules.Instant(civil, s.zone); at.After(t) {
			return at
		}
	}
}

// nextReal finds the next instant whose civil time matches. Between two changes of the zone's offset civil time and real time
// run alike, so the search goes stretch by stretch.
func (s Schedule) nextReal(t time.Time) time.Time {
	civil := wall(t, s.zone)
	for {
		at := t.Add(s.search(civil).Sub(civil)).In(s.zone)
		_, end := t.In(s.zone).ZoneBounds()
		if end.IsZero() || at.Before(end) {
			return at
		}
		t = end
		civil = wall(end, s.zone)
		if s.matches(civil) {
			return end.In(s.zone)
		}
	}
}

func (s Schedule) matches(civil time.Time) bool {
	return s.search(civil.Add(-time.Nanosecond)).Equal(civil)
}

// search is the library's search for a matching minute, which gives up after five years. 29 February is eight years away
// around a year such as 2100 that has none.
func (s Schedule) search(civil time.Time) time.Time {
	next := s.match.Next(civil)
	for next.IsZero() {
		civil = civil.AddDate(4, 0, 0)
		next = s.match.Next(civil)
	}
	return next
}

// wall is what a clock on the wall shows at t, written as if it were UTC.
func wall(t time.Time, zone *time.Location) time.Time {
	t = t.In(zone)
	_, offset := t.Zone()
	return t.Add(time.Duration(offset) * time.Second).UTC()
}

func earlier(a, b time.Time) time.Time {
	if b.Before(a) {
		return b
	}
	return a
}

// Latest is the newest run at or before t. It is the zero time only for the zero Schedule.
func (s Schedule) Latest(t time.Time) time.Time {
	if s.Next(t).IsZero() {
		return time.Time{}
	}
	reach := 1
	for s.Next(seconds(t, -reach)).After(t) {
		reach *= 2
	}
	near := sort.Search(reach, func(n int) bool { return !s.Next(seconds(t, -n)).After(t) })
	return s.Next(seconds(t, -near))
}

func seconds(t time.Time, n int) time.Time { return t.Add(time.Duration(n) * time.Second) }
