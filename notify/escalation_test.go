package notify

import (
	"testing"

	"strayd/rules"
)

// A group's own channels for that are told whatever they take otherwise; where it names none, those that took the flags.
func TestWhoIsTold(t *testing.T) {
	teller := &Teller{Channels: []rules.Channel{{Name: "desk", For: []string{"equity"}}, {Name: "head", Kinds: []rules.Kind{rules.KindLimit}}, {Name: "all"}}}
	flags := []rules.Flag{breachOf("alder", 12).Flag, limitOf("alder", 13).Flag}
	told := func(g rules.Group) map[string][]uint64 {
		out := map[string][]uint64{}
		for _, n := range teller.Escalations(rules.EscalationNews{At: made, Group: g, Flags: flags, Step: rules.Step{Stage: rules.Held, At: made, Due: made}}) {
			equal(t, "kind", n.Kind, rules.KindEscalation)
			out[n.Channel] = n.Refs
		}
		return out
	}
	equal(t, "without names", told(rules.Group{Name: "equity"}), map[string][]uint64{"desk": {12, 13}, "head": {13}, "all": {12, 13}})
	equal(t, "with a name", told(rules.Group{Name: "equity", Escalate: []string{"head"}}), map[string][]uint64{"head": {12, 13}})
}
