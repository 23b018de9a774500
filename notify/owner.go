package notify

import (
	"time"

	"strayd/rules"
)

// ownerLine says who should look, by when, and which release waits for it.
func (t *Teller) ownerLine(f *rules.FlagNews, read time.Time) string {
	g := t.group(f.Group)
	owner := g.Owner
	if t.Owner != nil && f.Series != "" {
		if o := t.Owner(f.Series); o != "" {
			owner = o
		}
	}
	var s string
	if owner != "" {
		s = "For " + name(owner)
	}
	if g.Reply > 0 {
		s = join(s, "reply by "+clock(read.Add(g.Reply), read, t.Zone))
	}
	return upperFirst(join(s, t.releaseWords(g, f.Date, read)))
}

func (t *Teller) releaseWords(g rules.Group, d rules.Date, read time.Time) string {
	if g.Release == nil || d == rules.NoDate {
		return ""
	}
	at := t.Deadline(*g.Release, d)
	if at.Before(read) {
		return "the release of " + name(g.Name) + " was at " + clock(at, read, t.Zone)
	}
	return "holds back the release of " + name(g.Name) + " at " + clock(at, read, t.Zone)
}

// Deadline is the moment that a due time means for a valuation date.
func (t *Teller) Deadline(due rules.Due, d rules.Date) time.Time {
	for n := 0; n < due.Days; {
		if d++; t.business(d) {
			n++
		}
	}
	zone, err := time.LoadLocation(due.Timezone)
	if err != nil || due.Timezone == "" {
		zone = zoneOr(t.Zone)
	}
	y, m, day := d.Time().Date()
	return time.Date(y, m, day, 0, due.Minutes, 0, 0, zone)
}

func (t *Teller) business(d rules.Date) bool {
	if t.Business != nil {
		return t.Business(d)
	}
	return rules.Weekdays(d-1, d) == 1
}

func (t *Teller) group(of string) rules.Group {
	for _, g := range t.Groups {
		if g.Name == of && of != "" {
			return g
		}
	}
	return rules.Group{}
}

// join puts a semicolon between two texts that are there.
func join(a, b string) string {
	if a == "" || b == "" {
		return a + b
	}
	return a + "; " + b
}
