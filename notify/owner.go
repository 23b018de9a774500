package notify

import (
	"time"

	"strayd/rules"
)

// ownerLine says who should look, by when, and which release waits for it.
func (t *Teller) ownerLine(f *rules.FlagNews, read time.Time) string {
	g, s := t.group(f.Group), t.ownerWords(f)
	if g.Reply > 0 {
		s = join(s, "reply by "+clock(read.Add(g.Reply), read, t.Zone))
	}
	return upperFirst(join(s, t.releaseWords(g, f.Date, read)))
}

// ownerWords say who should look, nothing where nobody is named.
func (t *Teller) ownerWords(f *rules.FlagNews) string {
	owner := t.group(f.Group).Owner
	if t.Owner != nil && f.Series != "" {
		owner = or(t.Owner(f.Series), owner)
	}
	if owner == "" {
		return ""
	}
	return "For " + name(owner)
}

func (t *Teller) releaseWords(g rules.Group, d rules.Date, read time.Time) string {
	if g.Release == nil || d == rules.NoDate {
		return ""
	}
	at := t.dueAt(*g.Release, d)
	if at.Before(read) {
		return "the release of " + name(g.Name) + " was at " + clock(at, read, t.Zone)
	}
	return "holds back the release of " + name(g.Name) + " at " + clock(at, read, t.Zone)
}

// dueAt is the moment that a due time means for a valuation date.
func (t *Teller) dueAt(due rules.Due, d rules.Date) time.Time {
	zone, err := time.LoadLocation(due.Timezone)
	if err != nil || due.Timezone == "" {
		zone = zoneOr(t.Zone)
	}
	return rules.DueAt(due, d, zone)
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
