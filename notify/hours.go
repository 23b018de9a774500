package notify

import "time"

// Hours is the part of the day in which a channel takes notices, in minutes of the day on the wall clock of a zone. It may run
// over midnight. From == To means always; so does the zero value.
type Hours struct {
	From, To int
	Zone     *time.Location // nil for UTC
}

// Opening is the first whole minute not before t, or t itself, at which the channel takes notices.
//
// It looks minute by minute, so that a clock change needs no rule of its own: an opening time that a change skips begins with the
// first minute that exists, and a part of the day that a change skips whole is missing on that day only.
func (h Hours) Opening(t time.Time) time.Time {
	if h.From == h.To || h.open(t) {
		return t
	}
	for t = t.Truncate(time.Minute).Add(time.Minute); !h.open(t); {
		t = t.Add(time.Minute)
	}
	return t
}

func (h Hours) open(t time.Time) bool {
	t = t.In(zoneOr(h.Zone))
	m := t.Hour()*60 + t.Minute()
	if h.From < h.To {
		return m >= h.From && m < h.To
	}
	return m >= h.From || m < h.To
}

func zoneOr(z *time.Location) *time.Location {
	if z == nil {
		return time.UTC
	}
	return z
}
