package calendar

import (
	"fmt"
	"regexp"
	"strings"
	"sync"
	"time"

	"github.com/rickar/cal/v2"

	"strayd/rules"
)

// The years for which national holidays are computed: fixed, so that a calendar does not change as time goes by.
const (
	FirstYear = 1980
	LastYear  = 2099
)

var codeText = regexp.MustCompile(`^[A-Z]{2}(-[A-Z0-9]{1,3})?$|^ECB$`)

// Parse reads the text of a calendar. place gives the path of a file that the text names. The error names the part that is wrong.
func Parse(text string, place func(name string) string) (*rules.Calendar, error) {
	week := ^rules.Week(0)
	var closed, open []rules.Date
	weeks := false
	for part := range strings.SplitSeq(text, "+") {
		part = strings.TrimSpace(part)
		if w, ok := weekOf(part); ok {
			week, weeks = week&w, true
			continue
		}
		days, opened, err := daysOf(part, place)
		if err != nil {
			return nil, err
		}
		closed, open = append(closed, days...), append(open, opened...)
	}
	if !weeks {
		week = rules.MondayToFriday
	}
	if week == 0 {
		return nil, fmt.Errorf("calendar %q leaves no business day in a week", text)
	}
	return rules.NewCalendar(week, closed, open), nil
}

// Plain says whether a text means every day from Monday to Friday.
func Plain(text string) bool { return text == "" || text == everyWeekday }

const everyWeekday = "weekdays"

// weekOf reads the days of a week: weekdays, daily, or the first and the last such as sun-thu.
func weekOf(text string) (w rules.Week, ok bool) {
	switch text {
	case everyWeekday:
		return rules.MondayToFriday, true
	case "daily":
		return 0b1111111, true
	}
	from, to, ok := strings.Cut(text, "-")
	first, last := dayNamed(from), dayNamed(to)
	if !ok || first < 0 || last < 0 || first == last {
		return 0, false
	}
	for d := first; ; d = (d + 1) % 7 {
		w |= 1 << d
		if d == last {
			return w, true
		}
	}
}

// dayNamed is the weekday of an English abbreviation of three letters, -1 when it is none.
func dayNamed(s string) int {
	for d := time.Sunday; d <= time.Saturday; d++ {
		if s == strings.ToLower(d.String()[:3]) {
			return int(d)
		}
	}
	return -1
}

// daysOf are the days that a nation or a file closes, and those that a file opens.
func daysOf(part string, place func(string) string) (closed, open []rules.Date, err error) {
	if code := strings.ToUpper(part); codeText.MatchString(code) {
		list, ok := nations()[code]
		if !ok {
			return nil, nil, fmt.Errorf("calendar %q: no holidays are known of it; give a file of days", part)
		}
		return computed(list), nil, nil
	}
	if part == "" {
		return nil, nil, fmt.Errorf("a part of the calendar is empty; expected a week such as sun-thu, a nation's code or a file of days")
	}
	return read(place(part), part)
}

// inUTC makes the library reckon in a zone without gaps: by default it goes by the machine's, where a midnight may not exist.
var inUTC = sync.OnceFunc(func() { cal.DefaultLoc = time.UTC })

// computed are the days of holidays, on the day and where another day is observed for it on that, as the library has it.
func computed(list holidays) (days []rules.Date) {
	inUTC()
	for year := FirstYear - 1; year <= LastYear+1; year++ { // a new year's day may be observed in the year before
		for _, h := range list {
			actual, observed := h.Calc(year)
			for _, t := range []time.Time{actual, observed} {
				if !t.IsZero() {
					days = append(days, rules.DateFrom(t))
				}
			}
		}
	}
	return days
}
