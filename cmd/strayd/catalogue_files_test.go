package main

import (
	"fmt"
	"strings"

	"strayd/rules/drill"
)

func fileRows() []catalogueRow {
	return []catalogueRow{
		{6, "the file of the day before under a new date", gated, "", func(c *catalogue) {
			c.refused(strings.ReplaceAll(c.text(c.at-1), c.book.Dates[c.at-1].String(), c.book.Dates[c.at].String()), "")
		}},
		{17, "rows that stand twice, alike", gated, "", func(c *catalogue) {
			text := c.text(c.at)
			c.index()
			c.funds(text + lastLine(text))
			c.pass("17:30", exitDone) // one of the two is kept, and the file's note says so
			if got := c.list("history", c.book.Series[len(c.book.Series)-1].ID, "--from", c.book.Dates[c.at].String()); len(got) == 0 {
				c.t.Error("the row is lost")
			}
			c.quiet(c.book.Series[len(c.book.Series)-1].ID)
		}},
		{18, "two values for one series and date", gated, "", func(c *catalogue) {
			text := c.text(c.at)
			last := lastLine(text)
			c.refused(text+last[:strings.LastIndex(last, ",")]+",7.77\n", "")
		}},
		{23, "decimal commas", gated, "", func(c *catalogue) {
			lines := strings.Split(strings.TrimSuffix(c.text(c.at), "\n"), "\n")
			for i := range lines[1:] {
				lines[i+1] = strings.Replace(lines[i+1], ".", ",", 1)
			}
			c.refused(strings.Join(lines, "\n")+"\n", "cells")
		}},
		{24, "a file that breaks off in a row", gated, "", func(c *catalogue) {
			text := c.book.Broken(drill.FundsFeed, c.at, 0.7, false)
			c.refused(text[:strings.LastIndex(text, ",")], "")
		}},
		{25, "a whole file without three of its series", gated, "", func(c *catalogue) {
			lines := strings.SplitAfter(c.text(c.at), "\n")
			c.index()
			c.funds(strings.Join(lines[:len(lines)-4], ""))
			c.pass("17:30", exitDone)
			c.flagged(record{"kind": "missing", "feed": drill.FundsFeed}, "west-14")
		}},
		{26, "a file that comes after its deadline", gated, "", func(c *catalogue) {
			c.index()
			c.pass("19:40", exitDone)
			c.funds(c.text(c.at))
			c.pass("20:10", exitDone)
			c.flagged(record{"kind": "late", "feed": drill.FundsFeed}, "")
		}},
		{27, "the file of the day before again", gated, "", func(c *catalogue) {
			c.come(1)
			before := c.text(c.at - 1)
			c.funds(before)
			if out := c.pass("17:30", exitDone); !strings.Contains(out, "Nothing new to judge") {
				c.t.Errorf("the same content was taken: %s", out)
			}
			c.pass("19:40", exitDone)
			c.flagged(record{"kind": "late", "feed": drill.FundsFeed}, "")
		}},
		{28, "a value of a week ago is changed", detected, "", func(c *catalogue) {
			c.come(1)
			at := c.at - 5
			c.book.Values[at][c.series(withBenchmark)] += 4 * c.book.Series[0].Tick * 1000
			text, _ := c.book.Text(drill.FundsFeed, at, at+1)
			c.index()
			c.funds(c.text(c.at) + strings.Join(strings.SplitAfter(text, "\n")[1:], ""))
			c.pass("17:30", exitDone)
			c.flagged(record{"kind": "restated", "series": withBenchmark}, "changed by")
		}},
		{30, "a row of a Saturday", gated, "", func(c *catalogue) {
			for c.book.Dates[c.at].Weekday() != 5 {
				c.come(1)
			}
			friday := c.book.Dates[c.at]
			c.refused(strings.ReplaceAll(c.text(c.at), friday.String(), (friday+1).String()), "")
		}},
		{31, "a row of the future", gated, "", func(c *catalogue) {
			c.refused(strings.Replace(c.text(c.at), c.book.Dates[c.at].String(), (c.book.Dates[c.at]+366).String(), 1), "")
		}},
		{31, "a row of long ago", gated, "", func(c *catalogue) {
			c.refused(strings.Replace(c.text(c.at), c.book.Dates[c.at].String(), "1999-03-01", 1), "")
		}},
		{32, "day and month exchanged", gated, "", func(c *catalogue) {
			for {
				d := c.book.Dates[c.at].String()
				if exchanged := d[:5] + d[8:] + "-" + d[5:7]; d[8:] <= "12" && d[8:] != d[5:7] {
					c.refused(strings.ReplaceAll(c.text(c.at), d, exchanged), "")
					return
				}
				c.come(1)
			}
		}},
		{37, "a changed header", gated, "", func(c *catalogue) {
			c.refused(strings.Replace(c.text(c.at), "return", "daily_return", 1), "return")
		}},
		{37, "columns in another order under their names", gated, "", func(c *catalogue) {
			var out strings.Builder
			for _, line := range strings.Split(strings.TrimSuffix(c.text(c.at), "\n"), "\n") {
				cells := strings.Split(line, ",")
				fmt.Fprintf(&out, "%s,%s,%s\n", cells[2], cells[0], cells[1])
			}
			c.index()
			c.funds("\ufeff" + out.String())
			c.pass("17:30", exitDone) // read by name, so that nothing is wrong
			c.quiet(withBenchmark)
		}},
	}
}

// lastLine is the last row of a file.
func lastLine(text string) string {
	lines := strings.SplitAfter(strings.TrimSuffix(text, "\n"), "\n")
	return lines[len(lines)-1] + "\n"
}

func contextRows() []catalogueRow {
	return []catalogueRow{
		{21, "one value for five days", detected, "", func(c *catalogue) {
			id := withBenchmark
			sum := 1.0
			for days := range 5 {
				sum *= 1 + c.value(id, days).Float()
			}
			for days := range 4 {
				*c.value(id, days) = -1 << 63
			}
			c.reprint(id, 4, sum-1)
			c.come(5)
			c.flagged(record{"kind": "missing"}, id)
		}},
		{29, "a silent rewrite of the past", detected, "", func(c *catalogue) {
			at := c.at
			for t := at - 100; t < at; t++ {
				for s := range c.book.Series {
					if c.book.Series[s].Feed == drill.FundsFeed {
						c.book.Values[t][s] += c.book.Series[s].Tick
					}
				}
			}
			text, _ := c.book.Text(drill.FundsFeed, at-100, at)
			c.index()
			c.funds(text + strings.Join(strings.SplitAfter(c.text(at), "\n")[1:], ""))
			c.try("pass", "--settled", "--now", c.book.Dates[at].String()+"T17:30:00Z")
			c.flagged(record{"kind": "restated|refused"}, "")
		}},
		{33, "a series held against the wrong benchmark", outOfReach, "the values are right: the pass sees that the benchmark explains nothing and " +
			"judges without it; the loss of fit is for a weekly look", func(c *catalogue) {
			c.write("series.csv", strings.Replace(c.book.RegisterText(), withBenchmark+",north,north-index", withBenchmark+",north,south-index", 1))
			c.come(3)
			c.quiet(withBenchmark)
		}},
		{34, "a wrong benchmark", detected, "", func(c *catalogue) {
			c.add(northIndex, 0, 350)
			c.come(1)
			c.flagged(record{"series": northIndex, "looks_like": "reference-wrong"}, "")
		}},
		{35, "an estimate that is replaced by the final value", detected, "", func(c *catalogue) {
			c.come(1)
			c.book.Values[c.at-1][c.series(withBenchmark)] += 2 * c.book.Series[0].Tick
			c.funds(c.text(c.at - 1))
			c.pass("18:00", exitDone)
			c.flagged(record{"kind": "restated", "series": withBenchmark}, "changed by")
		}},
		{38, "a series that ends without a word", gated, "", func(c *catalogue) {
			*c.value(withBenchmark, 0) = -1 << 63
			c.come(1)
			c.flagged(record{"kind": "missing"}, withBenchmark)
		}},
		{38, "a series that ends by the register", gated, "", func(c *catalogue) {
			var out strings.Builder
			for i, line := range strings.Split(strings.TrimSuffix(c.book.RegisterText(), "\n"), "\n") {
				end := ""
				if i == 0 {
					end = "end"
				} else if strings.HasPrefix(line, withBenchmark+",") {
					end = (c.book.Dates[c.at] - 1).String()
				}
				fmt.Fprintf(&out, "%s,%s\n", line, end)
			}
			c.write("series.csv", out.String())
			*c.value(withBenchmark, 0) = -1 << 63
			c.come(1)
			for _, f := range c.flags() {
				if f["kind"] == "missing" {
					c.t.Errorf("missed although it ended: %v", f)
				}
			}
		}},
		{39, "swing pricing of 1.2 % that stays", detected, "", func(c *catalogue) {
			c.add(withBenchmark, 0, 120)
			c.come(1)
			// By the numbers alone it cannot be told from a distribution that the calendar does not have.
			c.flagged(record{"series": withBenchmark, "looks_like": "genuine||missed-distribution|double-distribution"}, "")
		}},
		{40, "managed prices: half of each day's return comes a day late", outOfReach, "each value is one that the series might have; only " +
			"the pattern of weeks tells",
			func(c *catalogue) {
				held := 0.0
				for days := range 10 {
					r := c.value(withPeers, days).Float()
					c.reprint(withPeers, days, r/2+held)
					held = r / 2
				}
				c.come(10)
			}},
	}
}
