package feed

import (
	"bytes"
	"fmt"
	"strconv"
	"strings"

	"strayd/rules"
)

// dateStyle is a declared way to write dates, taken apart. Everything that is no token must stand there as it is.
type dateStyle struct {
	text     string
	excel    bool
	from1904 bool // serial days count from 1904-01-01, as a workbook says
	tokens   []dateToken
	width    int
}

// dateToken is YYYY, YY, MM, DD or MMM; or, with kind 0, one literal byte.
type dateToken struct {
	kind    byte // 'Y' year, 'y' year of two digits, 'M' month, 'N' month's name, 'D' day
	literal byte
	width   int
}

const (
	excelStyle = "excel"
	firstYear  = 1900
	// pivotYear: years of two digits from it on are of the 1900s, the others of the 2000s, as POSIX strptime has it for %y.
	pivotYear = 69
	// excelShift is serial day 0 of the 1900 system counted from 1970-01-01, for serials after its 29 February 1900 (serial 60),
	// a day that never was (ECMA-376, part 1, 18.17.4.1).
	excelShift = -25569
	// shift1904 is serial day 0 of the 1904 system in the 1900 system.
	shift1904 = 1462
)

var dateTokens = []struct {
	text string
	kind byte
}{{"YYYY", 'Y'}, {"YY", 'y'}, {"MMM", 'N'}, {"MM", 'M'}, {"DD", 'D'}}

// parseStyle takes a style apart. It must hold a year, a month and a day once each.
func parseStyle(style string) (dateStyle, error) {
	s := dateStyle{text: style, excel: style == excelStyle}
	if s.excel {
		return s, nil
	}
	seen := map[byte]int{}
	for rest := style; rest != ""; {
		t := nextToken(rest)
		rest = rest[t.width:]
		s.tokens = append(s.tokens, t)
		s.width += t.width
		switch t.kind {
		case 'Y', 'y':
			seen['Y']++
		case 'M', 'N':
			seen['M']++
		case 'D':
			seen['D']++
		}
	}
	if seen['Y'] != 1 || seen['M'] != 1 || seen['D'] != 1 {
		return s, fmt.Errorf("date style %q needs a year (YYYY or YY), a month (MM or MMM) and a day (DD) once each, or is excel", style)
	}
	return s, nil
}

func nextToken(s string) dateToken {
	for _, t := range dateTokens {
		if strings.HasPrefix(s, t.text) {
			return dateToken{kind: t.kind, width: len(t.text)}
		}
	}
	return dateToken{literal: s[0], width: 1}
}

// date reads a cell. The reason is empty when it is good.
func (s *dateStyle) date(cell []byte) (rules.Date, string) {
	if s.excel {
		return s.serial(cell)
	}
	if len(cell) != s.width {
		return rules.NoDate, "date is not written " + s.text
	}
	year, month, day, ok := s.fields(cell)
	if !ok {
		return rules.NoDate, "date is not written " + s.text
	}
	d, ok := rules.DateOf(year, month, day)
	if !ok {
		return rules.NoDate, "the calendar has no such day (read as " + s.text + ")"
	}
	return d, ""
}

// fields takes a cell of the style's width apart.
func (s *dateStyle) fields(cell []byte) (year, month, day int, ok bool) {
	ok = true
	for _, t := range s.tokens {
		part := cell[:t.width]
		cell = cell[t.width:]
		switch t.kind {
		case 'Y':
			year, ok = digitsOnly(part, ok)
		case 'y':
			year, ok = digitsOnly(part, ok)
			year = fullYear(year)
		case 'M':
			month, ok = digitsOnly(part, ok)
		case 'D':
			day, ok = digitsOnly(part, ok)
		case 'N':
			month = monthNamed(part)
			ok = ok && month > 0
		default:
			ok = ok && part[0] == t.literal
		}
	}
	return year, month, day, ok
}

func digitsOnly(part []byte, ok bool) (int, bool) {
	return int(number(part)), ok && digitsAt(part) == len(part)
}

func fullYear(y int) int {
	if y >= pivotYear {
		return 1900 + y
	}
	return 2000 + y
}

const monthNames = "jan feb mar apr may jun jul aug sep oct nov dec"

// monthNamed is the month of an English abbreviation of three letters, 0 when it is none.
func monthNamed(part []byte) int {
	i := strings.Index(monthNames, string(bytes.ToLower(part)))
	if i < 0 || i%4 != 0 {
		return 0
	}
	return i/4 + 1
}

// serial reads a serial day.
func (s *dateStyle) serial(cell []byte) (rules.Date, string) {
	n, err := strconv.Atoi(string(cell))
	if err != nil || digitsAt(cell) != len(cell) || len(cell) > 7 {
		return rules.NoDate, "date is not a whole serial day (45292 is 2024-01-01)"
	}
	switch {
	case s.from1904:
		return rules.Date(n + excelShift + shift1904), ""
	case n == 60:
		return rules.NoDate, "serial day 60 stands for 29 February 1900, which never was"
	case n < 60:
		return rules.Date(n + excelShift + 1), ""
	}
	return rules.Date(n + excelShift), ""
}

// inBounds says what is wrong with a day of the calendar as a valuation date, nothing when all is well.
func inBounds(d, newest rules.Date) string {
	if first, _ := rules.DateOf(firstYear, 1, 1); d < first {
		return fmt.Sprintf("date %s lies before %d", d, firstYear)
	}
	if d > newest {
		return fmt.Sprintf("date %s lies in the future, after %s", d, newest)
	}
	return ""
}
