package notify

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"strayd/rules"
)

// worstShown is how many events a digest names.
const worstShown = 4

// digest is the one notice of a storm: how many flags, of which kinds and groups, the worst few, and where the rest is listed.
func (t *Teller) digest(c rules.Channel, news rules.News, events []event) rules.Notice {
	n := t.notice(c, rules.KindDigest, news.At)
	flags := slices.Concat(events...)
	keys := []any{c.Name, rules.KindDigest}
	for _, e := range events {
		n.Refs = append(n.Refs, e.refs()...)
		keys = append(keys, eventKey(c, e))
	}
	n.Key = key(keys...)
	first, last := dates(flags)
	if first == last {
		n.Date = first
	}
	worst := slices.Clone(events)
	slices.SortStableFunc(worst, func(x, y event) int { return cmp.Compare(gravity(x), gravity(y)) })
	worst = worst[:worstShown]
	lines := []string{t.digestHead(flags, c.Short)}
	if !c.Short {
		lines = append(lines, groupWords(flags))
	}
	for _, e := range worst {
		lines = append(lines, digestLine(e.shown(), c.Short))
	}
	lines = append(lines, moreLine(len(events)-len(worst), first, last))
	if !c.Short {
		lines = append(lines, t.digestFile(news))
	}
	n.Lines = fit(lines)
	return n
}

// dates are the first and the last valuation date of flags; NoDate where one has none.
func dates(flags []*rules.FlagNews) (first, last rules.Date) {
	first, last = flags[0].Date, flags[0].Date
	for _, f := range flags {
		first, last = min(first, f.Date), max(last, f.Date)
	}
	return first, last
}

func (t *Teller) digestHead(flags []*rules.FlagNews, short bool) string {
	if short {
		return fmt.Sprintf("To look at: %s", rules.Counted(len(flags), "flag"))
	}
	s := fmt.Sprintf("DIGEST of %s", rules.Counted(len(flags), "flag"))
	switch first, last := dates(flags); {
	case last == rules.NoDate:
	case first == last:
		s += " for " + last.Day()
	case first == rules.NoDate:
		s += " up to " + last.Day()
	default:
		s += " from " + first.Day() + " to " + last.Day()
	}
	return s + ": " + tally(flags, 3, func(f *rules.FlagNews) string { return string(f.Kind) })
}

func groupWords(flags []*rules.FlagNews) string {
	s := tally(flags, 5, func(f *rules.FlagNews) string { return f.Group })
	if s == "" {
		return ""
	}
	return "By group: " + s
}

// tally counts flags by a word, the most frequent first, naming at most so many words.
func tally(flags []*rules.FlagNews, most int, word func(*rules.FlagNews) string) string {
	counts := map[string]int{}
	for _, f := range flags {
		if w := word(f); w != "" {
			counts[w]++
		}
	}
	words := make([]string, 0, len(counts))
	for w := range counts {
		words = append(words, w)
	}
	slices.SortFunc(words, func(x, y string) int { return cmp.Or(counts[y]-counts[x], cmp.Compare(x, y)) })
	rest := words[min(most, len(words)):]
	words = words[:len(words)-len(rest)]
	for i, w := range words {
		words[i] = fmt.Sprintf("%s %s", name(w), rules.Thousands(counts[w]))
	}
	if len(rest) > 0 {
		words = append(words, fmt.Sprintf("%d more", len(rest)))
	}
	return strings.Join(words, ", ")
}

// gravity orders events, the gravest lowest: by the logarithm of the smallest tail; those without a tail follow, by size.
func gravity(e event) float64 {
	least := math.Inf(1)
	for _, f := range e {
		if f.Log10.OK {
			least = min(least, f.Log10.V)
		}
	}
	if !math.IsInf(least, 1) {
		return least
	}
	if r := e[0].Return; r != rules.Missing {
		return 1 / (1 + math.Abs(r.Float())) // logarithms of tails are at most 0
	}
	return 1
}

func digestLine(e event, short bool) string {
	if short {
		return subject(e[0]) + ", " + refWords(e)
	}
	s := subject(e[0])
	if f := e[0]; f.Return != rules.Missing && f.Series != "" {
		s += " returned " + rules.InPercent(f.Return.Float())
	} else if f.Kind == rules.KindMarketDay {
		s += ": median " + rules.InPercent(f.Return.Float())
	}
	if z := e[0].Z; z.OK {
		s += fmt.Sprintf(", z %+.1f", z.V)
	}
	return s + fmt.Sprintf(" (%s, %s)", strings.ToLower(kindWords(e)), refWords(e))
}

func moreLine(more int, first, last rules.Date) string {
	s := fmt.Sprintf("and %s more: strayd flags", rules.Thousands(more))
	switch {
	case first == last && last != rules.NoDate:
		return s + " --date " + last.String()
	case first == rules.NoDate:
		return s
	}
	return s + " --from " + first.String() + " --to " + last.String()
}

func (t *Teller) digestFile(news rules.News) string {
	if news.File == "" {
		return ""
	}
	return fmt.Sprintf("File %s of feed %s, taken %s; %s, %s on its newest date", name(news.File), name(news.Feed),
		clock(news.At, news.At, t.Zone), rules.Counted(news.Rows, "row"), rules.Counted(news.Series, "series"))
}
