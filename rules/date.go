package rules

import (
	"fmt"
	"time"
)

// Date is a valuation date: whole days since 1970-01-01 in the proleptic Gregorian calendar, without a time zone.
type Date int32

// NoDate stands where no date applies. It is before every other date.
const NoDate Date = -1 << 31

// DateOf gives the date of a year, month (1 to 12) and day. ok is false when the calendar has no such day.
func DateOf(year, month, day int) (d Date, ok bool) {
	if month < 1 || month > 12 || day < 1 || day > daysIn(year, month) {
		return NoDate, false
	}
	return civil(year, month, day), true
}

// civil counts days by shifting the year to start in March, so that the leap day comes last.
func civil(year, month, day int) Date {
	if month <= 2 {
		year--
		month += 12
	}
	era := floorDiv(year, 400)
	yearOfEra := year - era*400
	dayOfYear := (153*(month-3)+2)/5 + day - 1
	dayOfEra := yearOfEra*365 + yearOfEra/4 - yearOfEra/100 + dayOfYear
	return Date(era*146097 + dayOfEra - 719468)
}

func floorDiv(a, b int) int {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

var monthDays = [...]int{31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31}

func daysIn(year, month int) int {
	if month == 2 && year%4 == 0 && (year%100 != 0 || year%400 == 0) {
		return 29
	}
	return monthDays[month-1]
}

// ParseDate reads an ISO date, YYYY-MM-DD.
func ParseDate(s string) (Date, error) {
	t, err := time.Parse(time.DateOnly, s)
	if err != nil {
		return NoDate, fmt.Errorf("date %q is not a day of the calendar written YYYY-MM-DD", s)
	}
	return DateFrom(t), nil
}

// DateFrom is the calendar day of t in t's own location.
func DateFrom(t time.Time) Date {
	y, m, d := t.Date()
	return civil(y, int(m), d)
}

// Time is midnight UTC at the start of the date.
func (d Date) Time() time.Time { return time.Unix(int64(d)*86400, 0).UTC() }

// String writes the date as YYYY-MM-DD, and nothing for NoDate.
func (d Date) String() string {
	if d == NoDate {
		return ""
	}
	return d.Time().Format(time.DateOnly)
}

// Weekday is the day of the week.
func (d Date) Weekday() time.Weekday {
	return time.Weekday((int(d)%7 + 7 + 4) % 7) // 1970-01-01 was a Thursday
}

// Weekdays counts the days from Monday to Friday after from, up to and including to; 0 when to is not after from.
func Weekdays(from, to Date) int {
	if to <= from {
		return 0
	}
	return weekdaysUpTo(to) - weekdaysUpTo(from)
}

// weekdaysUpTo counts Mondays to Fridays from Monday 1970-01-05 (day 4) up to and including d; negative before it.
func weekdaysUpTo(d Date) int {
	n := int(d) - 4
	week := floorDiv(n, 7)
	return week*5 + min(n-week*7+1, 5)
}
