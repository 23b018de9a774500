package rules

import (
	"bytes"
	"fmt"
	"slices"
)

// mostChanges is how many differences of settings are put into words.
const mostChanges = 12

// Differences say in words what sets one text of settings off from another.
func Differences(old, now *Settings) []string {
	var out []string
	say := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	for _, r := range old.Ranges {
		n := slices.IndexFunc(now.Ranges, func(x Range) bool { return x.Name == r.Name })
		if n < 0 {
			say("range %s taken out", r.Name)
			continue
		}
		out = append(out, rangeDifferences(r, now.Ranges[n])...)
	}
	for _, r := range now.Ranges {
		if !slices.ContainsFunc(old.Ranges, func(x Range) bool { return x.Name == r.Name }) {
			say("range %s added", r.Name)
		}
	}
	if old.Doubtful != now.Doubtful {
		say("doubtful: %s to %s", InPercentPlain(old.Doubtful), InPercentPlain(now.Doubtful))
	}
	if !same(Settings{Calendar: old.Calendar, Calendars: old.Calendars, CalendarOf: old.CalendarOf}, Settings{Calendar: now.Calendar, Calendars: now.Calendars, CalendarOf: now.CalendarOf}) {
		say("calendars changed")
	}
	if !same(old.Groups, now.Groups) {
		say("groups changed: %d to %d", len(old.Groups), len(now.Groups))
	}
	if n := changedKeys(old.Assigned, now.Assigned) + changedKeys(old.References, now.References) + changedKeys(old.Currencies, now.Currencies); n > 0 {
		say("%s of the register changed (group, reference or currency)", Counted(n, "entry"))
	}
	if !same(old.Events, now.Events) {
		say("events: %d to %d", len(old.Events), len(now.Events))
	}
	if len(out) > mostChanges {
		out = append(out[:mostChanges-1], fmt.Sprintf("and %d more", len(out)-mostChanges+1))
	}
	return out
}

func same(a, b any) bool { return bytes.Equal(encode(a), encode(b)) }

func changedKeys(a, b map[string]string) (n int) {
	for k, v := range a {
		if w, ok := b[k]; !ok || v != w {
			n++
		}
	}
	for k := range b {
		if _, ok := a[k]; !ok {
			n++
		}
	}
	return n
}

func rangeDifferences(old, now Range) (out []string) {
	say := func(what string, a, b any) {
		if !same(a, b) {
			out = append(out, fmt.Sprintf("range %s: %s %s to %s", now.Name, what, wordsOf(a), wordsOf(b)))
		}
	}
	if (old.Limit == nil) != (now.Limit == nil) {
		return []string{fmt.Sprintf("range %s: a limit and an estimated range have changed places", now.Name)}
	}
	if old.Limit != nil {
		say("limit", *old.Limit, *now.Limit)
	}
	say("of", old.Of, now.Of)
	say("for", old.For, now.For)
	say("window", old.Window, now.Window)
	say("scale", old.Scale, now.Scale)
	say("decay", old.Decay, now.Decay)
	say("tail", old.Tail, now.Tail)
	say("predictive", old.Predictive, now.Predictive)
	say("side", old.Side, now.Side)
	say("watch", old.Watch, now.Watch)
	say("breach", old.Breach, now.Breach)
	say("pending", old.Pending, now.Pending)
	return out
}

// wordsOf writes a setting as the configuration would.
func wordsOf(v any) string {
	switch x := v.(type) {
	case Line:
		return x.words()
	case Limit:
		return fmt.Sprintf("[%s, %s]", InPercent(x.Low.Float()), InPercent(x.High.Float()))
	case TailModel:
		if x.Name == "t" {
			return fmt.Sprintf("t with %g degrees of freedom", x.DF)
		}
		return x.Name
	case []string:
		if len(x) == 0 {
			return "all"
		}
	}
	return fmt.Sprint(v)
}

func (l Line) words() string {
	switch {
	case l.Tail > 0:
		return "tail " + InPercentPlain(l.Tail)
	case l.Confidence > 0:
		return "confidence " + InPercentPlain(l.Confidence)
	case l.Z > 0:
		return fmt.Sprintf("z %g", l.Z)
	}
	return fmt.Sprintf("budget %g a week (tail %s)", l.Budget, InPercentPlain(l.Level))
}
