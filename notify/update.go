package notify

import (
	"fmt"
	"strings"

	"strayd/rules"
)

// mostTold is how many flags of one act a message names.
const mostTold = 3

// Updates tell the channels that take some flags what somebody did about them: one message a channel, which goes with the one that told of
// the flags.
func (t *Teller) Updates(news rules.ActNews) (out []rules.Notice) {
	for _, c := range t.Channels {
		var flags []*rules.FlagNews
		for i := range news.Flags {
			if takes(c, &news.Flags[i]) {
				flags = append(flags, &rules.FlagNews{Flag: news.Flags[i]})
			}
		}
		if len(flags) == 0 {
			continue
		}
		n := t.notice(c, rules.KindUpdate, news.At)
		n.Refs = event(flags).refs()
		n.Key = key(c.Name, rules.KindUpdate, news.Step)
		n.Lines = fit(t.update(c, news, flags))
		out = append(out, n)
	}
	return t.markTold(out)
}

// update says what was done, about which flags, by whom and why.
func (t *Teller) update(c rules.Channel, news rules.ActNews, flags []*rules.FlagNews) []string {
	head := fmt.Sprintf("%s: %s", strings.ToUpper(string(news.To())), rules.Counted(len(flags), "flag"))
	if len(flags) == 1 {
		head = fmt.Sprintf("%s: %s, ref %d", strings.ToUpper(string(news.To())), subject(flags[0]), flags[0].Ref)
	}
	lines := []string{head}
	if len(flags) > 1 {
		lines = append(lines, namedFlags(flags, mostTold)...)
	}
	if c.Short {
		return lines
	}
	var what []string
	if news.Conclusion != "" {
		what = append(what, news.Words())
	}
	if news.To() == rules.Waived {
		what = append(what, "until "+news.Until.Day())
	}
	if news.Reason != "" {
		what = append(what, string(news.Reason))
	}
	what = append(what, "by "+name(news.By.String())+" at "+clock(news.At, news.At, t.Zone))
	lines = append(lines, upperFirst(strings.Join(what, ", ")))
	if news.Override != "" {
		lines = append(lines, "Overridden: "+strings.TrimSpace(safe(news.Override)))
	}
	return append(lines, upperFirst(strings.TrimSpace(safe(news.Note))))
}
