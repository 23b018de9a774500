package notify

import (
	"fmt"
	"slices"
	"strings"

	"strayd/rules"
)

// reopened tells a channel of flags that ask again: one message a series and date, which goes with the one that told of it, or one for all
// of a storm.
func (t *Teller) reopened(c rules.Channel, news rules.News) (out []rules.Notice) {
	flags := make([]rules.FlagNews, len(news.Reopened))
	for i, f := range news.Reopened {
		flags[i] = rules.FlagNews{Flag: f, Used: rules.Missing}
	}
	events := t.events(c, flags)
	if len(events) > storm {
		events = []event{slices.Concat(events...)}
	}
	for _, e := range events {
		n := t.notice(c, rules.KindReopened, news.At)
		n.Refs, n.Date = e.refs(), e[0].Date
		n.Key = key(c.Name, rules.KindReopened, news.At.UnixNano(), eventKey(c, e))
		n.Lines = fit(t.openAgain(c, e, n))
		out = append(out, n)
	}
	return out
}

func (t *Teller) openAgain(c rules.Channel, e event, n rules.Notice) []string {
	if !e.oneValue() {
		return append([]string{"OPEN AGAIN: " + rules.Counted(len(e), "flag") + ", see strayd flags"}, namedFlags(e, storm-mostTold)...)
	}
	if c.Short {
		return []string{"Open again: " + subject(e[0]) + ", " + refWords(e)}
	}
	var notes []string
	for _, f := range e {
		if note := strings.TrimSpace(safe(f.Note)); note != "" && !slices.Contains(notes, note) {
			notes = append(notes, note)
		}
	}
	return []string{"OPEN AGAIN: " + head(e), upperFirst(strings.Join(notes, "; ")), t.ownerLine(e[0], n.Next), answerLine(e)}
}

// namedFlags are lines that name the first few flags, and count the others.
func namedFlags(flags []*rules.FlagNews, most int) (lines []string) {
	for _, f := range flags[:min(len(flags), most)] {
		lines = append(lines, fmt.Sprintf("%s, ref %d", subject(f), f.Ref))
	}
	if more := len(flags) - most; more > 0 {
		lines = append(lines, fmt.Sprintf("and %s more", rules.Thousands(more)))
	}
	return lines
}
