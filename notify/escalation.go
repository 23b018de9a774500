package notify

import (
	"fmt"
	"slices"
	"strings"

	"strayd/rules"
)

// escalated are the first words of each stage.
var escalated = map[rules.Stage]string{rules.NotAnswered: "NOT ANSWERED", rules.BeforeHold: "HOLDS BACK A RELEASE SOON", rules.Held: "RELEASE HELD BACK",
	rules.StillOpen: "STILL OPEN"}

// Escalations pass flags on that were not answered in time: to the channels that their group names for that, else to those that took them.
// One message a channel and stage of a group.
func (t *Teller) Escalations(news rules.EscalationNews) (out []rules.Notice) {
	for _, c := range t.Channels {
		if len(news.Group.Escalate) > 0 && !slices.Contains(news.Group.Escalate, c.Name) {
			continue
		}
		var e event
		for _, f := range news.Flags {
			if len(news.Group.Escalate) > 0 || takes(c, &f) {
				e = append(e, &rules.FlagNews{Flag: f, Used: rules.Missing})
			}
		}
		if len(e) == 0 {
			continue
		}
		n := t.notice(c, rules.KindEscalation, news.At)
		n.Refs, n.Date = e.refs(), e[0].Date
		n.Key = key(c.Name, rules.KindEscalation, news.Stage, news.Group.Name, news.Step.At.Unix(), fmt.Sprint(n.Refs))
		n.Lines = fit(t.escalation(c, news, e, n))
		out = append(out, n)
	}
	return out
}

func (t *Teller) escalation(c rules.Channel, news rules.EscalationNews, e event, n rules.Notice) []string {
	words := escalated[news.Stage]
	if len(e) > 1 {
		lines := []string{words + ": " + rules.Counted(len(e), "flag")}
		if news.Group.Name != "" {
			lines[0] += " of group " + name(news.Group.Name)
		}
		if lines = append(lines, namedFlags(e, mostTold)...); c.Short {
			return lines
		}
		return append(lines, t.stageLine(news, n), "What is behind them: strayd explain REF. Answer: strayd decide REFS genuine | error --reason WHY --note TEXT")
	}
	if c.Short {
		return []string{words + ": " + subject(e[0]) + ", " + refWords(e)}
	}
	return []string{words + ": " + head(e), join(t.stageLine(news, n), lowerFirst(t.ownerWords(e[0]))), answerLine(e)}
}

func lowerFirst(s string) string { return strings.ToLower(s[:min(1, len(s))]) + s[min(1, len(s)):] }

// stageLine says which time is over, or near.
func (t *Teller) stageLine(news rules.EscalationNews, n rules.Notice) string {
	due := clock(news.Due, n.Next, t.Zone)
	switch news.Stage {
	case rules.NotAnswered:
		return "Nobody has acknowledged it; the reply was due by " + due
	case rules.BeforeHold:
		return "The release of " + name(news.Group.Name) + " is due at " + due
	case rules.Held:
		return "The release of " + name(news.Group.Name) + " was due at " + due + " and is still held back"
	}
	return "It has asked for " + rules.Counted(news.Days, "business day")
}
