package weekly

import (
	"fmt"

	"strayd/rules"
)

func (b *builder) found() *section {
	s := &section{Key: "found", Title: "Who found the errors, and how soon"}
	now, last := &b.now.Closed, &b.last.Closed
	all, before := now.ByUs+now.ByProvider+now.ByClient, last.ByUs+last.ByProvider+last.ByClient
	s.say("By us", counts(now.ByUs, all, last.ByUs, before))
	s.say("By the provider", counts(now.ByProvider, all, last.ByProvider, before))
	s.first("By a client", counts(now.ByClient, all, last.ByClient, before))
	x, y := &b.now.Found, &b.last.Found
	hours := func(v float64) value { return real(v, 1) }
	s.say("Values of which the arrival is known", counts(x.Timed, len(x.Errors), y.Timed, len(y.Errors)))
	s.say("Median hours from arrival to the flag", both(optional(x.ToFlag, hours), optional(y.ToFlag, hours)))
	s.say("Median hours from arrival to the decision", both(optional(x.ToWord, hours), optional(y.ToWord, hours)))
	s.say("At or above the group's materiality, of those with a size", counts(x.Material, x.Sized, y.Material, y.Sized))
	s.say("Below it", counts(x.Below, x.Sized, y.Below, y.Sized))
	s.say("With a size, and no materiality set", counts(x.Unset, x.Sized, y.Unset, y.Sized))
	s.say("Without a size, since no better value is known", counts(len(x.Errors)-x.Sized, len(x.Errors), len(y.Errors)-y.Sized, len(y.Errors)))
	t := table{Key: "error", Title: "Values decided to be wrong, with what was put in their place", Empty: "None.",
		Head: []string{"flag", "series", "date", "received", "put in its place", "size", "materiality", "found by", "hours to the flag",
			"hours to the decision", "decided by", "note"}}
	for i := range x.Errors {
		t.Rows = append(t.Rows, errorRow(&x.Errors[i]))
	}
	s.Tables = []table{t}
	s.Notes = []string{"Of the flags decided error or corrected: by a client or the provider where the decision's note says \"found by client\" or " +
		"\"found by provider\", or where the provider's own restatement raised the flag; the rest by us.",
		"The size is that of the return, received against corrected. Materiality is the figure that the configuration has for the group (materiality); " +
			"whether an error is material is for your rules and those of the fund's home."}
	return s
}

func errorRow(e *rules.FoundError) row {
	instead, size, limit := value{"left out", ""}, value{"-", ""}, value{"not set", ""}
	if e.Decision.Conclusion == rules.Corrected {
		instead = units(e.Decision.Value)
	}
	if e.Size.OK {
		size = inBP(e.Size.V)
	}
	if e.Materiality > 0 {
		limit = inBP(e.Materiality)
		if e.Material() {
			limit.Text += ", reached"
		}
	}
	hours := func(v float64) value { return real(v, 1) }
	return row{ref(&e.Flag), []cell{only(subject(&e.Flag)), only(date(e.Date)), only(units(e.Return)), only(instead), only(size), only(limit),
		only(text(string(e.Finder))), only(optional(e.ToFlag, hours)), only(optional(e.ToWord, hours)), only(foreign(e.Decision.By.String())),
		only(note(e.Decision.Note))}}
}

func inBP(v float64) value { return value{fmt.Sprintf("%.2f bp", 1e4*v), real(v, 6).Raw} }
