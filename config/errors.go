package config

import (
	"cmp"
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// Error is one fault of a configuration.
type Error struct {
	File      string
	Line, Col int    // from 1
	Path      string // of the key; "" for the file as a whole
	Message   string
	Got, Want string // "" where there is nothing to say
	Hint      string // for the person; "" for none
}

// Error is file:line:col: path: message (got X; expected Y; hint).
func (e Error) Error() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s:%d:%d: ", e.File, e.Line, e.Col)
	if e.Path != "" {
		b.WriteString(e.Path + ": ")
	}
	b.WriteString(e.Message)
	var more []string
	if e.Got != "" {
		more = append(more, "got "+e.Got)
	}
	if e.Want != "" {
		more = append(more, "expected "+e.Want)
	}
	if e.Hint != "" {
		more = append(more, e.Hint)
	}
	if len(more) > 0 {
		b.WriteString(" (" + strings.Join(more, "; ") + ")")
	}
	return b.String()
}

// Errors is everything that is wrong with a configuration, in the order of the file.
type Errors []Error

// Error is one fault a line.
func (e Errors) Error() string {
	lines := make([]string, len(e))
	for i := range e {
		lines[i] = e[i].Error()
	}
	return strings.Join(lines, "\n")
}

func (d *decoder) sorted(file string) Errors {
	for i := range d.faults {
		d.faults[i].File = file
	}
	slices.SortStableFunc(d.faults, func(a, b Error) int {
		return cmp.Or(cmp.Compare(a.Line, b.Line), cmp.Compare(a.Col, b.Col), cmp.Compare(a.Path, b.Path))
	})
	return d.faults
}

// secret matches tokens of the chat service and addresses that carry a secret of their own.
var secret = regexp.MustCompile(`(?i)\bx(?:ox[a-z]|app)-[a-z0-9]|https?://hooks\.[a-z0-9.-]+/(?:services|workflows|triggers)/`)

// longest is how much of a value an error repeats.
const longest = 60

// shown is a value as an error may repeat it: quoted, cut, and never a secret.
func shown(s string) string {
	if secret.MatchString(s) {
		return "a secret"
	}
	if r := []rune(s); len(r) > longest {
		return strconv.Quote(string(r[:longest])) + "..."
	}
	return strconv.Quote(s)
}

// trouble is what is wrong with one value. Empty fields take what the shape says of itself.
type trouble struct{ message, got, want, hint string }

func (t trouble) Error() string { return t.message }
