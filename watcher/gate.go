package watcher

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"slices"

	"strayd/rules"
)

const (
	// sampleBlocks and sampleWidth bound how much of a very large file is held against the past: runs of series of evenly spread blocks.
	sampleBlocks, sampleWidth = 4, 128
	// gatedDates is how many of a file's newest dates are held against the past.
	gatedDates = 20
)

// fileGate holds one file against what is held, before anything of it is judged.
type fileGate struct {
	p      *Pass
	j      *judging
	v      View
	feed   rules.Feed
	sheet  *Sheet
	blocks []block
	flags  []*FlagRow
}

// gate refuses a file that cannot be right by what is held, with a *BadFile, and gives the flags of series that are missing in it. A file
// that a person released is not refused.
func (p *Pass) gate(j *judging, f rules.Feed, sheet *Sheet, blocks []block) ([]*FlagRow, error) {
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	g := &fileGate{p: p, j: j, v: v, feed: f, sheet: sheet, blocks: blocks}
	for _, look := range []func() (*rules.Refusal, error){g.ending, g.dates, g.compare, g.shift, g.completeness} {
		r, err := look()
		if err != nil {
			return nil, err
		}
		if r != nil && !p.Released[sheet.File.SHA256] {
			return nil, &BadFile{File: sheet.File, Date: r.Date, Reason: r.Why, Ask: r.Ask, LooksLike: r.LooksLike, Gate: true}
		}
	}
	return g.flags, nil
}

// gateKey is the feed key under which a file that the gate refused is found again: it changes with the feed's settings, the calendars and
// the series' lives, so that the file is tried again then.
func (p *Pass) gateKey(f rules.Feed) string { return p.FeedKey(f) + p.gateText }

// gateMark parts the hash of a feed's settings from what the gate looked at.
const gateMark = "+"

func gateText(s *rules.Settings) string {
	text, err := json.Marshal(rules.Settings{Calendar: s.Calendar, Calendars: s.Calendars, CalendarOf: s.CalendarOf, Lives: s.Lives,
		References: s.References})
	if err != nil {
		panic(err) // texts and whole numbers only
	}
	sum := sha256.Sum256(text)
	return gateMark + hex.EncodeToString(sum[:8])
}

// compare holds the sizes and the values of the file's newest dates against the past.
func (g *fileGate) compare() (*rules.Refusal, error) {
	dates := changedDates(g.blocks)
	dates = dates[max(0, len(dates)-gatedDates):]
	if len(dates) == 0 || len(g.j.held) == 0 || dates[0] <= g.j.held[0] {
		return nil, nil
	}
	sample := g.sample(dates)
	if len(sample) == 0 {
		return nil, nil
	}
	n, _ := slices.BinarySearch(g.j.held, dates[0])
	past := g.j.held[max(0, n-rules.TypicalDates):n]
	for i := range sample {
		if err := g.load(&sample[i], past); err != nil {
			return nil, err
		}
	}
	prior := priorRatios(sample, len(past))
	for _, d := range dates {
		day := rules.FileDay{Date: d, Values: g.values(sample, d), Prior: prior}
		day.Past = g.pastOf(sample, d)
		for _, refuse := range []func(rules.FileDay) *rules.Refusal{rules.RefuseRepeat, rules.RefuseScale} {
			if r := refuse(day); r != nil {
				usual, err := g.zeroDays(r, sample, d)
				if err != nil || !usual {
					return r, err
				}
			}
		}
		ratio, _ := rules.SizeRatio(day.Values)
		prior = append([]float64{ratio}, prior...)
	}
	return nil, nil
}

// changedDates lists the dates on which a file changes anything, ascending.
func changedDates(blocks []block) (dates []rules.Date) {
	for _, b := range blocks {
		for _, d := range b.days {
			dates = append(dates, d.date)
		}
	}
	slices.Sort(dates)
	return slices.Compact(dates)
}
