package watcher

import (
	"slices"

	"strayd/rules"
)

// coverCount counts, over a run of dates, the values that each range judged and those beyond its lines: by group and date, and by series
// one after another. One worker's at a time.
type coverCount struct {
	under  []*lane
	shares []float64                 // that the inner lines promise beyond them
	dates  []rules.Date              // that are counted, ascending
	covers []map[string]*rules.Cover // by lane, then group
	at     [][]*rules.Cover          // by lane, then series of the task
	tracks [][]track                 // the same
}

// track is what the counted dates said of one series under one lane.
type track struct {
	judged       int
	outer, inner []int // at which of its judged values it was beyond, from 1
	thin         bool  // provisional on its newest date
	unjudged     bool
}

func newCoverCount(lanes []*lane, dates []rules.Date, width int) *coverCount {
	c := &coverCount{under: lanes, dates: dates}
	for _, l := range lanes {
		c.shares = append(c.shares, levelOf(l, l.gauge.Range.Watch))
		c.covers = append(c.covers, map[string]*rules.Cover{})
		c.at = append(c.at, make([]*rules.Cover, width))
		c.tracks = append(c.tracks, make([]track, width))
	}
	return c
}

// open begins a task whose series are in the given groups.
func (c *coverCount) open(t task, group func(int) string) {
	for k := range c.under {
		clear(c.tracks[k])
		for i := range t.width {
			c.at[k][i] = c.cover(k, group(i))
		}
	}
}

// cover is that of a lane and group.
func (c *coverCount) cover(k int, group string) *rules.Cover {
	got := c.covers[k][group]
	if got == nil {
		r := c.under[k].gauge.Range
		got = &rules.Cover{Range: r.Name, Of: r.Of, Group: group, Level: levelOf(c.under[k], r.Breach), Share: c.shares[k]}
		for _, d := range c.dates {
			got.Days = append(got.Days, rules.CoverDay{Date: d})
		}
		c.covers[k][group] = got
	}
	return got
}

// levelOf is the share that a line promises beyond it, 0 where it states none.
func levelOf(l *lane, line rules.Line) float64 {
	f, ok := l.gauge.Forms(line)
	if !ok {
		return 0
	}
	return f.Tail
}

// judgedValues counts the values of the n-th date that a lane has enough to judge by.
func (c *coverCount) judgedValues(k int, l *lane, n int, vals []int64) {
	tracks := c.tracks[k]
	for i, x := range vals {
		if x == Missing64 || !l.judges(i) {
			continue
		}
		size := l.windows.N(i)
		tracks[i].unjudged, tracks[i].thin = size < rules.LeastJudged, size < rules.LeastNormal
		if tracks[i].unjudged {
			continue
		}
		tracks[i].judged++
		c.at[k][i].Days[n].Judged++
	}
}

// concluded counts the verdict of a value that was counted as judged.
func (c *coverCount) concluded(k, i, n int, v *rules.Verdict) {
	d, t := &c.at[k][i].Days[n], &c.tracks[k][i]
	if v.Finding == rules.NotJudged {
		t.judged--
		d.Judged--
		t.unjudged = true
		return
	}
	if v.Finding == rules.Breach {
		t.outer = append(t.outer, t.judged)
		d.Outer++
	}
	if v.Tail.OK && v.Tail.V < c.at[k][i].Share {
		t.inner = append(t.inner, t.judged)
		d.Inner++
	}
}

// fold counts the series of a task into their groups, each with its newest judged values.
func (c *coverCount) fold(t task, names *Names, newest int) {
	for k := range c.tracks {
		for i := range t.width {
			if x := &c.tracks[k][i]; x.judged > 0 {
				c.at[k][i].TakeLong(string(names.Name(t.series(i))), tallyOf(x.judged, x.outer, newest), tallyOf(x.judged, x.inner, newest),
					tallyOf(x.judged, x.inner, rules.CoverDates))
			}
		}
	}
}

// tallyOf counts the newest of so many judged values, of which those at the given places, from 1 and ascending, were beyond.
func tallyOf(judged int, beyond []int, newest int) (c rules.CoverTally) {
	first := max(1, judged-newest+1)
	c.Judged = judged - first + 1
	before := 0 // the hit before
	for _, at := range beyond {
		if at < first {
			continue
		}
		c.Beyond++
		switch {
		case at == first: // it follows nothing
		case before == at-1:
			c.Transitions.N11++
		default:
			c.Transitions.N01++
		}
		before = at
	}
	n := &c.Transitions
	n.N10 = c.Beyond - n.N11
	if before == judged && c.Beyond > 0 { // nothing follows it
		n.N10--
	}
	n.N00 = max(0, c.Judged-1-n.N01-n.N10-n.N11)
	return c
}

// all gives the covers by range, then group, with their newest dates.
func (c *coverCount) all(newest int) (out []rules.Cover) {
	for k := range c.under {
		var groups []string
		for g := range c.covers[k] {
			groups = append(groups, g)
		}
		slices.Sort(groups)
		for _, g := range groups {
			one := c.covers[k][g]
			one.Days = one.Days[max(0, len(one.Days)-newest):]
			one.Sort()
			out = append(out, *one)
		}
	}
	return out
}
