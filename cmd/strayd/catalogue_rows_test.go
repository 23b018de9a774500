package main

import (
	"strings"

	"strayd/rules"
	"strayd/rules/drill"
)

// The series that the rows are played with: north-02 has a benchmark, a small residual, four decimals and a foreign currency; north-05 has
// two decimals; east-02 has peers.
const (
	withBenchmark = "north-02"
	elsewhere     = "south-02"
	withPeers     = "east-02"
	northIndex    = "north-index"
)

func breachLike(id, cause string) record { return record{"series": id, "looks_like": cause} }

func catalogueRows() []catalogueRow {
	return append(append(scaleRows(), valueRows()...), append(fileRows(), contextRows()...)...)
}

// timesAll multiplies every value of the next date's funds, by hundredths.
func (c *catalogue) timesAll(hundredths rules.Units) {
	for i := range c.book.Series {
		if s := &c.book.Series[i]; s.Feed == drill.FundsFeed {
			u := c.book.Values[c.at][i] / s.Tick * hundredths / 100
			c.book.Values[c.at][i] = u * s.Tick
		}
	}
}

func scaleRows() []catalogueRow {
	return []catalogueRow{
		{1, "per cent read as a fraction, one row", detected, "", func(c *catalogue) {
			c.scaled(withBenchmark, 100)
			c.come(1)
			c.flagged(breachLike(withBenchmark, "x100"), "")
		}},
		{1, "per cent read as a fraction, the file", gated, "", func(c *catalogue) {
			c.timesAll(10_000)
			c.refused(c.text(c.at), "times")
		}},
		{2, "basis points read as a fraction", detected, "", func(c *catalogue) {
			c.scaled(withPeers, 10_000)
			c.come(1)
			c.flagged(breachLike(withPeers, "x10000"), "")
		}},
		{3, "a fraction read as per cent, one row on a moving day", detected, "", func(c *catalogue) {
			c.large(withBenchmark, 120)
			*c.value(withBenchmark, 0) = *c.value(withBenchmark, 0) / 100 / 1e9 * 1e9
			c.come(1)
			c.flagged(breachLike(withBenchmark, "div100"), "")
		}},
		{3, "a fraction read as per cent, the file", gated, "", func(c *catalogue) {
			c.timesAll(1)
			c.refused(c.text(c.at), "")
		}},
		{4, "a slipped decimal", detected, "", func(c *catalogue) {
			c.large(withBenchmark, 80)
			c.scaled(withBenchmark, 10)
			c.come(1)
			c.flagged(breachLike(withBenchmark, "x10|genuine|"), "")
		}},
		{5, "a lost sign on a moving day", detected, "", func(c *catalogue) {
			c.large(withBenchmark, 80)
			c.scaled(withBenchmark, -1)
			c.come(1)
			c.flagged(breachLike(withBenchmark, "sign"), "")
		}},
		{6, "the value of the day before again", detected, "", func(c *catalogue) {
			*c.value(withBenchmark, 0) = *c.value(withBenchmark, -1)
			c.come(1)
			c.flagged(record{"series": withBenchmark, "kind": "repeat|breach", "looks_like": "repeat"}, "")
		}},
		{7, "a price that stands still", detected, "", func(c *catalogue) {
			*c.value(withPeers, 0), *c.value(withPeers, 1) = 0, 0
			c.come(2)
			c.flagged(record{"series": withPeers, "kind": "stale|breach", "looks_like": "zero"}, "")
		}},
		{8, "the values of the day before, for five days", gated, "", func(c *catalogue) {
			for range 5 {
				c.index()
				c.funds(strings.ReplaceAll(c.text(c.at-1), c.book.Dates[c.at-1].String(), c.book.Dates[c.at].String()))
				c.try("pass", "--settled", "--now", c.book.Dates[c.at].String()+"T17:30:00Z")
				c.at++
			}
			c.flagged(record{"kind": "refused", "feed": drill.FundsFeed, "looks_like": "shifted-date"}, "")
		}},
		{9, "a wrong price that is right again on the next day", detected, "", func(c *catalogue) {
			r1, r2 := c.value(withBenchmark, 0).Float(), c.value(withBenchmark, 1).Float()
			off := r1 + 0.12
			c.reprint(withBenchmark, 0, off)
			c.reprint(withBenchmark, 1, (1+r1)*(1+r2)/(1+off)-1)
			c.come(2)
			c.flagged(breachLike(withBenchmark, "spike-reversal"), "")
		}},
	}
}

func valueRows() []catalogueRow {
	return []catalogueRow{
		{10, "a listed distribution left out", detected, "", func(c *catalogue) {
			c.event(withBenchmark, "distribution", "0.011")
			c.add(withBenchmark, 0, -110)
			c.come(1)
			c.flagged(breachLike(withBenchmark, "missed-distribution"), "")
		}},
		{11, "a listed distribution counted twice", detected, "", func(c *catalogue) {
			c.event(withBenchmark, "distribution", "0.011")
			c.add(withBenchmark, 0, 110)
			c.come(1)
			c.flagged(breachLike(withBenchmark, "double-distribution"), "")
		}},
		{12, "a split of two for one left out", detected, "", func(c *catalogue) {
			c.reprint(withPeers, 0, (1+c.value(withPeers, 0).Float())/2-1)
			c.come(1)
			c.flagged(breachLike(withPeers, "split"), "")
		}},
		{13, "the currency left out for ten days", detected, "", func(c *catalogue) {
			for days := range 10 {
				c.reprint(withBenchmark, days, (1+c.value(withBenchmark, days).Float())/(1+c.value("currency", days).Float())-1)
			}
			c.come(10)
			c.flagged(breachLike(withBenchmark, "fx-missing"), "")
		}},
		{14, "the currency counted twice for ten days", detected, "", func(c *catalogue) {
			for days := range 10 {
				c.reprint(withBenchmark, days, (1+c.value(withBenchmark, days).Float())*(1+c.value("currency", days).Float())-1)
			}
			c.come(10)
			c.flagged(breachLike(withBenchmark, "fx-twice"), "")
		}},
		{15, "hedged returns against an unhedged benchmark, from a date on", detected, "", func(c *catalogue) {
			for days := range 15 {
				c.reprint(withBenchmark, days, (1+c.value(withBenchmark, days).Float())/(1+c.value("currency", days).Float())-1)
			}
			c.come(15)
			c.flagged(breachLike(withBenchmark, "fx-missing"), "") // on values; which mapping is wrong is for a person
		}},
		{16, "gross instead of net of a fee of 1 % a year", outOfReach, "0.4 bp a day is a thirty-eighth of the smallest residual deviation here: the " +
			"mean of a year would be off by less than half its standard error", func(c *catalogue) {
			for days := range 20 {
				c.add(withBenchmark, days, 0.4)
			}
			c.come(20)
			c.quiet(withBenchmark)
		}},
		{19, "two series exchanged for five days", detected, "", func(c *catalogue) {
			for days := range 5 {
				a, b := c.value(withBenchmark, days), c.value(elsewhere, days)
				*a, *b = *b, *a
			}
			c.come(5)
			c.flagged(record{"series": withBenchmark + "|" + elsewhere, "looks_like": "swapped"}, "")
		}},
		{20, "the return since the first of five days", detected, "", func(c *catalogue) {
			sum := 1.0
			for days := range 8 {
				sum *= 1 + c.value(withBenchmark, days).Float()
				c.reprint(withBenchmark, days, sum-1)
			}
			c.come(8)
			c.flagged(breachLike(withBenchmark, "cumulative"), "")
		}},
		{22, "logarithmic instead of simple returns", outOfReach, "half the square of a return of 1 % is 0.5 bp, a thirtieth of the smallest residual " +
			"deviation here",
			func(c *catalogue) {
				for days := range 10 {
					r := c.value(withBenchmark, days).Float()
					c.reprint(withBenchmark, days, r-r*r/2)
				}
				c.come(10)
				c.quiet(withBenchmark)
			}},
		{36, "a number that stands for a missing value", detected, "", func(c *catalogue) {
			*c.value(withBenchmark, 0), *c.value(withPeers, 0) = -9999*(rules.One/10_000), 9999*(rules.One/100)
			c.come(1)
			c.flagged(record{"series": withBenchmark, "kind": "breach"}, "")
			c.flagged(record{"series": withPeers, "kind": "breach|limit"}, "")
		}},
		{36, "a word that stands for a missing value and is not declared", gated, "", func(c *catalogue) {
			lines := strings.Split(c.text(c.at), "\n")
			lines[3] = lines[3][:strings.LastIndex(lines[3], ",")] + ",#VALUE"
			c.refused(strings.Join(lines, "\n"), "#VALUE")
		}},
	}
}
