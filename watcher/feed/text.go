package feed

import (
	"bytes"
	"fmt"
	"unicode"
	"unicode/utf8"
)

// carriageReturn is said of a CR that is not followed by LF.
const carriageReturn = "a carriage return stands without a line feed; save the file with LF or CRLF line ends"

func tooLong(limit int) string {
	return fmt.Sprintf("the line is longer than %d bytes, the limit (is a quote left open?)", limit)
}

// badText says what is wrong with a cell as text, nothing when all is well.
func (p *plan) badText(cell []byte) string {
	switch {
	case len(cell) > p.limits.CellBytes:
		return fmt.Sprintf("the cell is longer than %d bytes, the limit", p.limits.CellBytes)
	case bytes.IndexByte(cell, 0) >= 0:
		return "the cell holds a NUL byte; a UTF-16 file needs encoding: utf-16"
	case !utf8.Valid(cell):
		return "the cell is not valid UTF-8; is the feed's encoding right?"
	}
	return ""
}

// badName says what is wrong with the name of a series, nothing when all is well.
func (p *plan) badName(name []byte) string {
	if len(name) == 0 {
		return "the name of the series is empty"
	}
	if problem := p.badText(name); problem != "" {
		return problem
	}
	if len(name) > p.limits.NameBytes {
		return fmt.Sprintf("the name of the series is longer than %d bytes, the limit", p.limits.NameBytes)
	}
	for _, r := range string(name) {
		if unicode.IsControl(r) || r == '\u200b' || r == '\ufeff' {
			return fmt.Sprintf("the name of the series holds the invisible character %U", r)
		}
	}
	if !bytes.Equal(bytes.TrimSpace(name), name) {
		return "a space that is not ASCII stands before or after the name of the series"
	}
	return ""
}
