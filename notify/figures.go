package notify

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
)

// percent writes a return for a person: signed per cent with two decimals, basis points under 0.1 %.
func percent(v float64) string {
	if a := math.Abs(v); a != 0 && a < 0.001 {
		return fmt.Sprintf("%+.2f bp", v*1e4)
	}
	return fmt.Sprintf("%+.2f %%", v*100)
}

// between writes a range with one or both of its lines, and nothing when it has none.
func between(low, high rules.Num) string {
	switch {
	case low.OK && high.OK:
		return percent(low.V) + " to " + percent(high.V)
	case low.OK:
		return percent(low.V) + " or above"
	case high.OK:
		return percent(high.V) + " or below"
	}
	return ""
}

// rarest is the longest waiting time that is told in a message: a series' own past supports no rarer one.
const rarest = 5000

// often writes a tail probability as a waiting time.
func often(tail float64) string {
	switch days := 1 / tail; {
	case days >= rarest:
		return "rarer than 1 in " + grouped(rarest)
	case days < 1.5:
		return "about every day"
	default:
		return "about once in " + grouped(int(math.Round(days))) + " days"
	}
}

// grouped writes a count with commas between thousands.
func grouped(n int) string {
	s := strconv.Itoa(n)
	for i := len(s) - 3; i > 0; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}

// counted writes a count with its noun: "1 row", "2 rows".
func counted(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return grouped(n) + " " + noun + plural(noun)
}

func plural(noun string) string {
	switch {
	case noun == "series":
		return ""
	case strings.HasSuffix(noun, "ch"):
		return "es"
	}
	return "s"
}

// day writes a date with its weekday.
func day(d rules.Date) string { return d.Time().Format("Mon 2006-01-02") }

// clock writes a moment with its zone; the day as well when it is another one than that on which it is read.
func clock(t, read time.Time, zone *time.Location) string {
	t, read = t.In(zoneOr(zone)), read.In(zoneOr(zone))
	if rules.DateFrom(t) == rules.DateFrom(read) {
		return t.Format("15:04 MST")
	}
	return t.Format("Mon 2006-01-02 15:04 MST")
}

// listed joins words as a sentence does: "a", "a and b", "a, b and c".
func listed(words []string) string {
	if len(words) < 2 {
		return strings.Join(words, "")
	}
	last := len(words) - 1
	return strings.Join(words[:last], ", ") + " and " + words[last]
}
