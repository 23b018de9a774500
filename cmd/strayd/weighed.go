package main

import (
	"fmt"
	"strings"

	"strayd/rules"
)

// reference is the reference of an explained verdict as JSON: its name and return, and what it leaves unexplained.
func (e *explained) reference() string {
	if e.weighed == nil || e.weighed.Reference == "" {
		return "null"
	}
	return object([]string{"series", "return", "residual"},
		[]cell{text(e.weighed.Reference), number(e.weighed.ReferenceReturn), number(e.weighed.Residual)}, "", " ")
}

// causes are what the value may be, the most probable first, as JSON objects.
func (e *explained) causes() (out []string) {
	for _, c := range e.shares() {
		out = append(out, object([]string{"cause", "share", "implied"},
			[]cell{text(string(c.Cause)), number(rules.Some(c.Share)), number(c.Implied)}, "    ", " "))
	}
	return out
}

func (e *explained) shares() []rules.Share {
	if e.weighed == nil || e.weighed.View == nil {
		return nil
	}
	return e.weighed.View.Causes
}

// explainWeighing says what the reference did and what the value may be.
func (e *explained) explainWeighing(line func(name, format string, args ...any)) {
	if e.weighed == nil {
		return
	}
	if r := e.weighed; r.Reference != "" {
		line("reference", "%s returned %s; %s is left unexplained", printable(r.Reference), percentNum(r.ReferenceReturn), percentNum(r.Residual))
	}
	var may []string
	for _, c := range e.shares() {
		s := fmt.Sprintf("%s %.1f %%", c.Cause, 100*c.Share)
		if c.Implied.OK {
			s += " (" + rules.InPercent(c.Implied.V) + ")"
		}
		may = append(may, s)
	}
	if len(may) > 0 {
		line("if not ordinary", "%s", strings.Join(may, ", "))
	}
	if f := e.flag; f != nil && f.LooksLike != "" {
		line("looks like", "%s (%s), a hypothesis", f.LooksLike.Words(), f.LooksLike)
	}
	if v := e.weighed.View; v != nil && v.Kind != "" {
		line("doubt", "odds of an error %s, doubt begins at %s (log odds %.2f and %.2f)", rules.Odds(v.LogOdds), rules.Odds(v.Line), v.LogOdds, v.Line)
	}
}
