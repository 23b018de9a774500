package notify

import (
	"strings"
	"time"

	"strayd/rules"
)

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
