package schedule

import (
	"errors"
	"fmt"
	"strconv"
	"strings"
	"time"
)

// shortest is the shortest interval at which a job may run.
const shortest = time.Minute

// names of the fields, their bounds and the words they know, in order.
var fields = []struct {
	name      string
	low, high int
	words     string // every word has three letters
}{
	{"minute", 0, 59, ""},
	{"hour", 0, 23, ""},
	{"day of month", 1, 31, ""},
	{"month", 1, 12, "jan feb mar apr may jun jul aug sep oct nov dec"},
	{"day of week", 0, 6, "sun mon tue wed thu fri sat"},
}

var descriptors = []string{"@hourly", "@daily", "@midnight", "@weekly", "@monthly", "@yearly", "@annually"}

// check refuses what the library would take in another sense, or refuse in words that do not help.
func check(spec string) error {
	if spec == "" {
		return errors.New("empty schedule: write five fields, such as 0 18 * * mon-fri")
	}
	if upper := strings.ToUpper(spec); strings.HasPrefix(upper, "TZ=") || strings.HasPrefix(upper, "CRON_TZ=") {
		return fmt.Errorf("%q sets a time zone: use the timezone key", spec)
	}
	if strings.HasPrefix(spec, "@") {
		return descriptor(spec)
	}
	parts := strings.Fields(spec)
	if len(parts) == len(fields)+1 {
		return fmt.Errorf("%q has 6 fields: seconds and years are not taken, write minute, hour, day of month, month, day of week", spec)
	}
	if len(parts) != len(fields) {
		return fmt.Errorf("%q has %d fields: write 5, minute, hour, day of month, month, day of week", spec, len(parts))
	}
	for i, text := range parts {
		for item := range strings.SplitSeq(text, ",") {
			if err := element(i, item); err != nil {
				return fmt.Errorf("%s %q: %w", fields[i].name, text, err)
			}
		}
	}
	return nil
}

func descriptor(spec string) error {
	word, _, _ := strings.Cut(spec, " ")
	if word == "@every" {
		return nil
	}
	for _, d := range descriptors {
		if spec == d {
			return nil
		}
		if strings.EqualFold(spec, d) {
			return fmt.Errorf("%q is written in small letters: %s", spec, d)
		}
	}
	return fmt.Errorf("%q is not known: write five fields, @every with a duration, or one of %s", spec, strings.Join(descriptors, ", "))
}

// interval reads the duration of @every: whole seconds, at least a minute.
func interval(rest string) (time.Duration, error) {
	text := strings.TrimSpace(rest)
	d, err := time.ParseDuration(text)
	switch {
	case err != nil:
		return 0, fmt.Errorf("@every %q is not a duration: write hours and minutes, such as 90m or 24h", text)
	case d < shortest:
		return 0, fmt.Errorf("@every %s is under the shortest interval, 1m", text)
	case d%time.Second != 0:
		return 0, fmt.Errorf("@every %s has a part of a second", text)
	}
	return d, nil
}

// element checks one element of a list: *, a value or a range, each with an optional step.
func element(i int, item string) error {
	body, step, stepped := strings.Cut(item, "/")
	low, high, ranged := strings.Cut(body, "-")
	switch {
	case item == "":
		return errors.New("empty list element")
	case stepped && !isStep(i, step):
		return fmt.Errorf("step %q is not a whole number from 1 to %d", step, fields[i].high)
	case (low == "*" || low == "?") && ranged:
		return fmt.Errorf("%q mixes %s with a range: write the first and the last value", item, low)
	case low == "*" || low == "?":
		return nil
	}
	first, err := value(i, low)
	if err != nil || !ranged {
		return err
	}
	last, err := value(i, high)
	if err == nil && last < first {
		err = fmt.Errorf("range %q runs backwards: write it as two, joined by a comma", body)
	}
	return err
}

func isStep(i int, text string) bool {
	n, err := strconv.ParseUint(text, 10, 16)
	return err == nil && n >= 1 && int(n) <= fields[i].high
}

func value(i int, text string) (int, error) {
	f := fields[i]
	if at := strings.Index(f.words, strings.ToLower(text)); len(text) == 3 && at >= 0 && at%4 == 0 {
		return f.low + at/4, nil
	}
	n, err := strconv.ParseUint(text, 10, 16)
	switch {
	case err != nil && f.words != "":
		return 0, fmt.Errorf("%q is not a number from %d to %d nor one of %s", text, f.low, f.high, f.words)
	case err != nil:
		return 0, fmt.Errorf("%q is not a number from %d to %d", text, f.low, f.high)
	case f.name == "day of week" && n == 7:
		return 0, errors.New("7 is not a day of the week here: Sunday is 0 or sun")
	case int(n) < f.low || int(n) > f.high:
		return 0, fmt.Errorf("%d is not from %d to %d", n, f.low, f.high)
	}
	return int(n), nil
}
