package notify

import (
	"fmt"
	"strings"

	"strayd/rules"
)

// stillNamed is how many series that did not move the message of a market day names.
const stillNamed = 8

// market is the full text of a market day: one message that names what did not move, and covers the breaches that the move explains.
func (t *Teller) market(news rules.News, e event, read rules.Notice) []string {
	f := e[0]
	head := fmt.Sprintf("MARKET DAY group %s: median %s for %s, ref %d", name(f.Group), rules.InPercent(f.Return.Float()), f.Date.Day(), f.Ref)
	lines := []string{head}
	if f.Market != nil {
		lines = append(lines, movedLine(f.Market), stillLine(f.Market))
	}
	return append(lines, coveredLine(e), t.fileLine(news, e), t.ownerLine(f, read.Next), answerLine(e))
}

func movedLine(m *rules.MarketNews) string {
	return fmt.Sprintf("%s have a value, %s moved; the median lies %.1f deviations out by their own past", rules.Counted(m.Reporting, "series"),
		rules.Thousands(m.Reporting-len(m.NotMoved)-len(m.Otherwise)), m.MedianZ)
}

func stillLine(m *rules.MarketNews) string {
	if len(m.NotMoved)+len(m.Otherwise) == 0 {
		return "All of them moved."
	}
	return both(someNamed("Did NOT move", m.NotMoved), someNamed("Moved otherwise", m.Otherwise))
}

// someNamed names the first of some series after what they did; "" where there are none.
func someNamed(what string, all []string) string {
	if len(all) == 0 {
		return ""
	}
	var names []string
	for _, s := range all[:min(stillNamed, len(all))] {
		names = append(names, name(s))
	}
	if more := len(all) - len(names); more > 0 {
		return fmt.Sprintf("%s (%s): %s and %d more", what, rules.Thousands(len(all)), strings.Join(names, ", "), more)
	}
	return what + ": " + strings.Join(names, ", ")
}

// coveredLine says which breaches the message stands for.
func coveredLine(e event) string {
	switch n := len(e) - 1; n {
	case 0:
		return "No breach is explained by it."
	case 1:
		return fmt.Sprintf("1 breach is explained by it and sent by no message of its own: ref %d", e[1].Ref)
	default:
		return fmt.Sprintf("%s breaches are explained by it and sent by no messages of their own: refs %s: strayd flags --date %s --group %q",
			rules.Thousands(n), span(e[1:].refs()), e[0].Date, name(e[0].Group))
	}
}

// span writes refs as runs: 12 to 15, 19.
func span(refs []uint64) string {
	var runs []string
	for i := 0; i < len(refs); {
		k := i
		for k+1 < len(refs) && refs[k+1] == refs[k]+1 {
			k++
		}
		if k > i+1 {
			runs = append(runs, fmt.Sprintf("%d to %d", refs[i], refs[k]))
		} else {
			for n := i; n <= k; n++ {
				runs = append(runs, fmt.Sprint(refs[n]))
			}
		}
		i = k + 1
	}
	if len(runs) > 6 {
		runs = append(runs[:5], "...")
	}
	return strings.Join(runs, ", ")
}
