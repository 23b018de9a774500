package notify

import (
	"fmt"
	"strings"
	"time"

	"strayd/rules"
)

// Daily tells every channel, whatever kinds and groups it takes, that all was checked, so that silence means something. One a
// channel and day of the zone.
func (t *Teller) Daily(d rules.DayNews) []rules.Notice {
	var out []rules.Notice
	for _, c := range t.Channels {
		n := t.notice(c, rules.KindDaily, d.At)
		n.Date = d.Date
		n.Key = key(c.Name, rules.KindDaily, rules.DateFrom(d.At.In(zoneOr(t.Zone))))
		n.Lines = fit(dailyLines(&d))
		out = append(out, n)
	}
	return out
}

func dailyLines(d *rules.DayNews) []string {
	lines := []string{dailyHead(d),
		fmt.Sprintf("%s taken, %d refused; %d beyond a limit, %d restated", rules.Counted(d.Files, "file"), d.Refused, d.Limits, d.Restated)}
	if len(d.Missing) > 0 {
		lines = append(lines, "Without a value: "+missingNames(d))
	}
	if len(d.Dead) > 0 {
		lines = append(lines, "Not delivering: "+strings.Join(d.Dead, "; "))
	}
	if d.Head != "" {
		lines = append(lines, "Head of the record: "+d.Head)
	}
	return append(lines, "A flag is a statistical statement about past data; no flag is no certificate.")
}

func dailyHead(d *rules.DayNews) string {
	s := "ALL CHECKED"
	if d.Checked < d.Expected || d.Feeds < d.FeedsDue || d.Refused > 0 {
		s = "CHECKED IN PART"
	}
	if d.Date != rules.NoDate {
		s += " for " + d.Date.Day()
	}
	s += fmt.Sprintf(": %s of %s series, %d of %d feeds, %s", rules.Thousands(d.Checked), rules.Thousands(d.Expected), d.Feeds, d.FeedsDue,
		rules.Counted(d.Breaches, "breach"))
	if n := len(d.Dead); n > 0 {
		s += ", " + rules.Counted(n, "dead channel")
	}
	if d.Open == 0 {
		return s + "; nothing open"
	}
	return s + fmt.Sprintf("; %d open, oldest ref %d (%s)", d.Open, d.OldestRef, rules.Counted(d.OldestDays, "day"))
}

func missingNames(d *rules.DayNews) string {
	var names []string
	for _, m := range d.Missing {
		names = append(names, name(m))
	}
	if more := d.Expected - d.Checked - len(names); more > 0 {
		names = append(names, rules.Thousands(more)+" more")
	}
	return strings.Join(names, ", ")
}

// Word is a word about the program itself, such as a channel that died or a pass that failed.
type Word struct {
	At    time.Time
	Key   string   // what it is about: the same key is told once
	Lines []string // the first complete alone, and all that a channel of short form is told
	But   string   // the channel that it is not told to, such as the dead one
}

// Word tells every channel but one.
func (t *Teller) Word(w Word) []rules.Notice {
	var out []rules.Notice
	for _, c := range t.Channels {
		if c.Name == w.But {
			continue
		}
		n := t.notice(c, rules.KindNotice, w.At)
		n.Key = key(c.Name, rules.KindNotice, w.Key)
		n.Lines = fit(w.Lines)
		if c.Short {
			n.Lines = n.Lines[:min(1, len(n.Lines))]
		}
		out = append(out, n)
	}
	return out
}

// Test is a notice that tries one channel out, at once whatever its hours. Each call's is another one.
func (t *Teller) Test(c rules.Channel, at time.Time) rules.Notice {
	n := t.notice(c, rules.KindTest, at)
	n.Next = at
	n.Key = key(c.Name, rules.KindTest, at.UnixNano())
	n.Lines = fit([]string{fmt.Sprintf("TEST of channel %s on %s: notices arrive here", name(c.Name),
		at.In(zoneOr(t.Zone)).Format("Mon 2006-01-02 15:04:05 MST"))})
	return n
}
