package notify

import (
	"slices"
	"strings"

	"strayd/rules"
)

// mostTold is how many flags of one act a message names.
const mostTold = 3

// Updates tell the channels that take some flags what somebody did about them: one message for each of up to three values, which goes with
// the one that told of its flags, or one for more.
func (t *Teller) Updates(news rules.ActNews) (out []rules.Notice) {
	for _, c := range t.Channels {
		var flags event
		for i := range news.Flags {
			if takes(c, &news.Flags[i]) {
				flags = append(flags, &rules.FlagNews{Flag: news.Flags[i]})
			}
		}
		for _, e := range byValue(flags) {
			n := t.notice(c, rules.KindUpdate, news.At)
			n.Refs = e.refs()
			n.Key = key(c.Name, rules.KindUpdate, news.Step, n.Refs)
			n.Lines = fit(t.update(c, news, e))
			out = append(out, n)
		}
	}
	return t.markTold(out)
}

// byValue puts the flags of one value together; all of them where they are about more values than are told of singly.
func byValue(flags event) (out []event) {
	for _, f := range flags {
		at := slices.IndexFunc(out, func(e event) bool { return f.Series != "" && f.Series == e[0].Series && f.Date == e[0].Date })
		if at < 0 {
			at, out = len(out), append(out, nil)
		}
		out[at] = append(out[at], f)
	}
	if len(out) > mostTold {
		return []event{flags}
	}
	return out
}

// oneValue says that the flags are about one value, or that there is one.
func (e event) oneValue() bool {
	return len(e) == 1 || e[0].Series != "" && !slices.ContainsFunc(e, func(f *rules.FlagNews) bool { return f.Series != e[0].Series || f.Date != e[0].Date })
}

// update says what was done, about which flags, by whom and why.
func (t *Teller) update(c rules.Channel, news rules.ActNews, flags event) []string {
	head := strings.ToUpper(string(news.To())) + ": " + rules.Counted(len(flags), "flag")
	if flags.oneValue() {
		head = strings.ToUpper(string(news.To())) + ": " + subject(flags[0]) + ", " + refWords(flags)
	}
	lines := []string{head}
	if !flags.oneValue() {
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
