package notify

import (
	"strings"
	"unicode"
	"unicode/utf8"
)

// Bounds of a notice in runes. The head leaves room for what the Sender appends to it.
const (
	mostLines = 8
	headRunes = 140
	lineRunes = 200
	allRunes  = 1500
	nameRunes = 48 // of a name within a line
)

// safe makes text from a file safe to show as one line: what is neither printable nor a space becomes "?", so that no control,
// no change of writing direction and no invisible character is left.
func safe(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r == utf8.RuneError:
			return '?'
		case unicode.IsPrint(r):
			return r
		case unicode.IsSpace(r) && r != '\u2028' && r != '\u2029':
			return ' '
		}
		return '?'
	}, s)
}

// cut shortens a text to a number of runes, the last three of them dots.
func cut(s string, most int) string {
	if utf8.RuneCountInString(s) <= most {
		return s
	}
	runes := []rune(s)
	return strings.TrimRight(string(runes[:most-3]), " ") + "..."
}

// name makes a name from a file safe and short enough to stand within a line. A name that shows nothing is quoted.
func name(s string) string {
	s = cut(strings.TrimSpace(safe(s)), nameRunes)
	if s == "" {
		return `""`
	}
	return s
}

// wrap breaks a text into so many lines, at spaces where there are any. What goes beyond is left to the last line's cut.
func wrap(s string, most int) []string {
	var lines []string
	for len(lines) < most-1 && utf8.RuneCountInString(s) > lineRunes {
		runes := []rune(s)
		line := string(runes[:lineRunes])
		if at := strings.LastIndexByte(line, ' '); at > 0 {
			line = line[:at]
		}
		lines = append(lines, line)
		s = strings.TrimSpace(s[len(line):])
	}
	return append(lines, s)
}

// fit holds the lines of a notice to its bounds. Empty lines are left out.
func fit(lines []string) []string {
	var out []string
	left := allRunes
	for _, l := range lines {
		most := lineRunes
		if len(out) == 0 {
			most = headRunes
		}
		if len(out) == mostLines || left < nameRunes {
			break
		}
		if l = cut(strings.TrimSpace(safe(l)), min(most, left)); l != "" {
			out = append(out, l)
			left -= utf8.RuneCountInString(l)
		}
	}
	return out
}
