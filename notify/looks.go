package notify

import (
	"fmt"
	"strings"

	"strayd/rules"
)

// referenceLine says what the reference did and what it leaves unexplained; nothing for a flag without one.
func referenceLine(f *rules.FlagNews) string {
	if f.Reference == "" || !f.ReferenceReturn.OK {
		return ""
	}
	who := "Its reference " + name(f.Reference)
	if f.Reference == rules.PeersReference {
		who = "The median of its peers"
	}
	s := who + " returned " + rules.InPercent(f.ReferenceReturn.V)
	if f.Residual.OK {
		s += "; " + rules.InPercent(f.Residual.V) + " is left unexplained"
	}
	return s
}

// looksLine says what a value looks like and what it would be then. It is a hypothesis and says so.
func looksLine(f *rules.FlagNews) string {
	if f.LooksLike == "" {
		return ""
	}
	s := "Looks like " + f.LooksLike.Words()
	if f.Share.OK {
		s += fmt.Sprintf(" (%s, %.0f %% if the day is not ordinary)", f.LooksLike, 100*f.Share.V)
	} else {
		s += fmt.Sprintf(" (%s)", f.LooksLike)
	}
	if f.Implied.OK {
		s += "; it would be " + rules.InPercent(f.Implied.V)
	}
	return s
}

// both puts two sentences into one line.
func both(a, b string) string {
	if a != "" && b != "" && !strings.HasSuffix(a, ".") {
		a += "."
	}
	return strings.TrimSpace(a + " " + b)
}
