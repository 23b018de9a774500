package weekly

import (
	"fmt"

	"strayd/rules"
)

// mostNotable is how many series with too many beyond the line are named.
const mostNotable = 25

func (b *builder) coverage() *section {
	s := &section{Key: "coverage", Title: fmt.Sprintf("Coverage over the last %d dates", rules.CoverDates)}
	t := table{Key: "pool", Title: "Pooled, beyond the inner line", Empty: "No range has judged anything.",
		Head: []string{"range and group", "inner line", "beyond, of judged", "expected", "Kupiec p", "p, together", "verdict", "Christoffersen p", "in clusters"}}
	outer := table{Key: "breach", Title: "Pooled, beyond the breach line", Empty: "No range has judged anything.",
		Head: []string{"range and group", "level", "beyond, of judged", "expected", "Kupiec p", "p, together", "verdict"}}
	zones := table{Key: "zone", Title: "Zones of the series, each over its own last 250 judged values", Empty: "No series has 250 judged values yet.",
		Head: []string{"range and group", "green", "yellow", "red", "more than 4, usual", "none at all, usual"}}
	last := map[string]rules.CoverFigures{}
	for _, c := range b.last.Covers {
		last[coverName(&c)] = c
	}
	for i := range b.now.Covers {
		c := &b.now.Covers[i]
		o := last[coverName(c)]
		t.Rows = append(t.Rows, innerRow(c, &o))
		outer.Rows = append(outer.Rows, outerRow(c, &o))
		if c.Zones.Whole() > 0 {
			zones.Rows = append(zones.Rows, zoneRow(c, &o))
		}
	}
	s.Tables = []table{t, outer, zones, b.notable(last)}
	b.firstCoverage(s, last)
	s.Notes = []string{"Judged again under the settings in force, over values as known now. Kupiec's p (1995) is the probability of a count as " +
		"far off by chance; together divides its ratio by the scatter of the counts of a day (Rao and Scott 1981), and the verdict goes by it.",
		"Christoffersen's p (1998) asks whether beyond follows beyond. Zones: Basle Committee, January 1996. Fewer than 250 judged, or a count of which " +
			"even none would be usual, is too little data to say."}
	return s
}

func (b *builder) firstCoverage(s *section, last map[string]rules.CoverFigures) {
	for i := range b.now.Covers {
		c := &b.now.Covers[i]
		if c.Group != "" || c.Series == 0 {
			continue
		}
		o := last[coverName(c)]
		s.first(fmt.Sprintf("Range %s: beyond the %s line in %d dates", foreign(c.Range).Text, rules.InPercentPlain(c.Share), rules.CoverDates),
			counts(c.Inner.Beyond, c.Inner.Judged, o.Inner.Beyond, o.Inner.Judged))
		s.first(fmt.Sprintf("Range %s: coverage", foreign(c.Range).Text), both(text(string(c.InnerSays.Verdict)), lastVerdict(&o)))
		s.say(fmt.Sprintf("Range %s: series with more than 4 beyond, of those with 250 judged", foreign(c.Range).Text),
			counts(len(c.Notable), c.Zones.Whole(), len(o.Notable), o.Zones.Whole()))
	}
}

func lastVerdict(o *rules.CoverFigures) value {
	if o.Series == 0 {
		return text(string(rules.TooLittle))
	}
	return text(string(o.InnerSays.Verdict))
}

func coverName(c *rules.CoverFigures) string {
	if c.Group == "" {
		return c.Range + ", all"
	}
	return c.Range + ", " + c.Group
}

func innerRow(c, o *rules.CoverFigures) row {
	v, w := &c.InnerSays, &o.InnerSays
	return row{foreign(coverName(c)), []cell{only(level(c.Share)), counts(c.Inner.Beyond, c.Inner.Judged, o.Inner.Beyond, o.Inner.Judged),
		both(real(v.Expected, 1), real(o.InnerSays.Expected, 1)), both(optional(v.Kupiec, chance), optional(w.Kupiec, chance)),
		both(optional(v.Moving, chance), optional(w.Moving, chance)),
		both(text(string(v.Verdict)), lastVerdict(o)), both(optional(v.Apart, chance), optional(w.Apart, chance)), both(clusters(v), clusters(w))}}
}

// clusters says whether beyond follows beyond.
func clusters(c *rules.Coverage) value {
	if c.Cluster {
		return text("yes")
	}
	return text("no")
}

func outerRow(c, o *rules.CoverFigures) row {
	v, w := &c.OuterSays, &o.OuterSays
	verdict, before := text(string(v.Verdict)), text(string(o.OuterSays.Verdict))
	if c.Level == 0 {
		verdict = text("the line promises no share")
	}
	if o.Series == 0 || o.Level == 0 {
		before = text(string(rules.TooLittle))
	}
	return row{foreign(coverName(c)), []cell{only(level(c.Level)), counts(c.Outer.Beyond, c.Outer.Judged, o.Outer.Beyond, o.Outer.Judged),
		both(real(v.Expected, 1), real(o.OuterSays.Expected, 1)), both(optional(v.Kupiec, chance), optional(w.Kupiec, chance)),
		both(optional(v.Moving, chance), optional(w.Moving, chance)), both(verdict, before)}}
}

func zoneRow(c, o *rules.CoverFigures) row {
	many, none := c.Chance()
	manyBefore, noneBefore := o.Chance()
	z, y := c.Zones, o.Zones
	byChance := func(n int, expected float64) value {
		return value{fmt.Sprintf("%s, %.1f by chance", rules.Thousands(n), expected), fmt.Sprint(n)}
	}
	return row{foreign(coverName(c)), []cell{counts(z.Green, z.Whole(), y.Green, y.Whole()), counts(z.Yellow, z.Whole(), y.Yellow, y.Whole()),
		counts(z.Red, z.Whole(), y.Red, y.Whole()), both(byChance(len(c.Notable), many), byChance(len(o.Notable), manyBefore)),
		both(byChance(c.None, none), byChance(o.None, noneBefore))}}
}

func (b *builder) notable(last map[string]rules.CoverFigures) table {
	t := table{Key: "series", Title: "Series with more than 4 beyond the inner line in 250", Empty: "None.",
		Head: []string{"series", "range", "group", "beyond, of judged", "zone", "verdict"}}
	for i := range b.now.Covers {
		c := &b.now.Covers[i]
		if c.Group != "" {
			continue
		}
		before := map[string]rules.SeriesCover{}
		o := last[coverName(c)]
		for _, x := range o.Notable {
			before[x.Series] = x
		}
		for n, x := range c.Notable {
			if n == mostNotable {
				t.Rows = append(t.Rows, row{text(fmt.Sprintf("and %s more", rules.Thousands(len(c.Notable)-n))), nil})
				break
			}
			beyond := cell{Now: count(x.Beyond), Of: count(x.Judged), Last: text("not listed")}
			if y, ok := before[x.Series]; ok {
				beyond.Last, beyond.LastOf = count(y.Beyond), count(y.Judged)
			}
			t.Rows = append(t.Rows, row{foreign(x.Series), []cell{only(foreign(c.Range)), only(foreign(x.Group)), beyond,
				only(text(string(x.Zone))), only(text(string(x.Verdict)))}})
		}
	}
	return t
}
