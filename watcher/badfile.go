package watcher

import (
	"strconv"
	"strings"
	"unicode/utf8"
)

// longestCell is how much of a bad cell is shown.
const longestCell = 60

// Place is the file with as much of line and column as is known.
func (b *BadFile) Place() string {
	s := b.File.Name
	if b.Where != "" {
		return s + ":" + b.Where
	}
	if b.Line > 0 {
		s += ":" + strconv.Itoa(b.Line)
		if b.Column > 0 {
			s += ":" + strconv.Itoa(b.Column)
		}
	}
	return s
}

// Note is the error with what to ask the provider for, also where the form alone is wrong and its reason does not say it.
func (b *BadFile) Note() string {
	if b.Ask == "" && b.Line > 0 && !strings.Contains(b.Reason, "ask the provider") {
		return b.Error() + "; ask the provider for the file with this put right"
	}
	return b.Error()
}

// Message is the reason, the cell and what to ask for, without the place.
func (b *BadFile) Message() string {
	s := b.Reason
	if b.Cell != "" {
		s += ": " + QuoteCell(b.Cell)
	}
	if b.Ask != "" {
		s += "; " + b.Ask
	}
	return s
}

// QuoteCell shows a cell's text quoted, cut on a rune boundary, control characters escaped.
func QuoteCell(s string) string {
	if len(s) <= longestCell {
		return strconv.Quote(s)
	}
	cut := longestCell
	for cut > 0 && !utf8.RuneStart(s[cut]) {
		cut--
	}
	return strconv.Quote(s[:cut]) + "..."
}
