package schedule

import (
	"errors"
	"fmt"
	"strings"
	"time"

	"github.com/robfig/cron/v3"
)

// Schedule says when a job runs. It holds no clock and no state, and may be shared.
type Schedule struct {
	spec  string
	zone  *time.Location
	match *cron.SpecSchedule // evaluated on civil time written as UTC; nil for @every
	every time.Duration      // of @every
	real  bool               // runs at every instant whose civil time matches: in a gap never, in a fold at both showings
	civil bool               // runs once for every civil time that matches: after a gap, at the first showing of a fold
}

// Parse reads cron text that is meant in the given zone (nil: UTC). Errors name the field, the text and what to write instead.
func Parse(spec string, zone *time.Location) (Schedule, error) {
	if zone == nil {
		zone = time.UTC
	}
	s := Schedule{spec: strings.TrimSpace(spec), zone: zone}
	if err := check(s.spec); err != nil {
		return Schedule{}, err
	}
	if rest, ok := strings.CutPrefix(s.spec, "@every"); ok {
		every, err := interval(rest)
		s.every = every
		return s, err
	}
	return s.parsed()
}

// Check says whether Parse would take the spec.
func Check(spec string) error {
	_, err := Parse(spec, time.UTC)
	return err
}

// parsed hands a checked spec to the library and decides how it meets gaps and folds.
func (s Schedule) parsed() (Schedule, error) {
	match, err := library(s.spec)
	if err != nil {
		return Schedule{}, fmt.Errorf("%q: %w", s.spec, err)
	}
	match.Location = time.UTC
	if match.Next(leapYear).IsZero() {
		return Schedule{}, fmt.Errorf("%q never runs: no month that it names has such a day", s.spec)
	}
	s.match = match
	minute, hour := s.clockFields()
	s.real = strings.HasPrefix(hour, "*") || strings.HasPrefix(minute, "*")
	s.civil = !strings.HasPrefix(hour, "*")
	return s, nil
}

// leapYear is where the search for a first match begins: 29 February is near, and the answer does not depend on today.
var leapYear = time.Date(2000, 1, 1, 0, 0, 0, 0, time.UTC)

// clockFields are the minute and hour fields, with ? written as *.
func (s Schedule) clockFields() (minute, hour string) {
	if s.spec == "@hourly" {
		return "0", "*"
	}
	if strings.HasPrefix(s.spec, "@") {
		return "0", "0"
	}
	f := strings.Fields(strings.ReplaceAll(s.spec, "?", "*"))
	return f[0], f[1]
}

// library parses with the cron library, which panics on some texts.
func library(spec string) (match *cron.SpecSchedule, err error) {
	defer func() {
		if recover() != nil {
			match, err = nil, errors.New("cannot be read")
		}
	}()
	p := cron.NewParser(cron.Minute | cron.Hour | cron.Dom | cron.Month | cron.Dow | cron.Descriptor)
	parsed, err := p.Parse(spec)
	if err != nil {
		return nil, err
	}
	match, ok := parsed.(*cron.SpecSchedule)
	if !ok {
		return nil, errors.New("cannot be read")
	}
	return match, nil
}

// String is the spec as written.
func (s Schedule) String() string { return s.spec }

// starBit is how the library marks a field that was written * (or */1).
const starBit = 1 << 63

// Warning names what in the spec is easily misread; empty when there is nothing.
func (s Schedule) Warning() string {
	if s.match == nil || (s.match.Dom|s.match.Dow)&starBit != 0 {
		return ""
	}
	return fmt.Sprintf("%q restricts the day of the month and the day of the week: it runs on days that match either, not both", s.spec)
}
