package notify

import (
	"slices"
	"time"

	"strayd/rules"
)

// Weekly is the weekly log as messages: one a channel and week, however often it is made.
type Weekly struct {
	At       time.Time
	Week     string   // such as 2026-W11
	Channels []string // by name; empty for all
	Lines    []string // the first complete alone, and all that a channel of short form is told
}

// Weekly tells the channels that get the weekly log.
func (t *Teller) Weekly(w Weekly) []rules.Notice {
	var out []rules.Notice
	for _, c := range t.Channels {
		if len(w.Channels) > 0 && !slices.Contains(w.Channels, c.Name) {
			continue
		}
		n := t.notice(c, rules.KindWeekly, w.At)
		n.Key = key(c.Name, rules.KindWeekly, w.Week)
		n.Lines = fit(w.Lines)
		if c.Short {
			n.Lines = n.Lines[:min(1, len(n.Lines))]
		}
		out = append(out, n)
	}
	return t.markTold(out)
}
