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

func gateText(s *rules.Settings) string {
	text, err := json.Marshal(rules.Settings{Calendar: s.Calendar, Calendars: s.Calendars, CalendarOf: s.CalendarOf, Lives: s.Lives,
		References: s.References})
	if err != nil {
		panic(err) // texts and whole numbers only
	}
	sum := sha256.Sum256(text)
	return "+" + hex.EncodeToString(sum[:8])
}

// stretch is a run of series of one block that are held against the past, and what is held of them.
type stretch struct {
	block   uint32
	offsets []int
	from    int       // the first of them
	past    [][]int64 // by held date, for from, from+1, ...
	before  []int64   // by offset: the newest value, going on through the file
	typical []typical // by offset
}

type typical struct {
	size          float64
	held, repeats int
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
		for _, refuse := range []func(rules.FileDay) *rules.Refusal{rules.RefuseRepeat, rules.RefuseScale} {
			if r := refuse(day); r != nil {
				return r, nil
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

// sample picks the series to be compared: those of the file that the ledger has, or of very many a part that depends on their numbers
// alone.
func (g *fileGate) sample(dates []rules.Date) (out []stretch) {
	known := g.blocks[:0:0]
	for _, b := range g.blocks {
		if int(b.number)*BlockSize < g.j.heldNames {
			known = append(known, b)
		}
	}
	step, width := 1, BlockSize
	if len(known) > 2 {
		step, width = max(1, len(known)/sampleBlocks), sampleWidth
	}
	for i := 0; i < len(known); i += step {
		if s := stretchOf(&known[i], dates, width, g.j.heldNames); len(s.offsets) > 0 {
			out = append(out, s)
		}
	}
	return out
}

// stretchOf takes at most width neighbouring series of a block that have a value on one of the dates.
func stretchOf(b *block, dates []rules.Date, width, heldNames int) stretch {
	present := make([]bool, min(BlockSize, heldNames-int(b.number)*BlockSize))
	vals := make([]int64, len(present))
	for _, d := range b.days {
		if d.date < dates[0] {
			continue
		}
		d.col.Fill(vals, 0, rules.Places)
		for i, v := range vals {
			present[i] = present[i] || v != Missing64
		}
	}
	s := stretch{block: b.number}
	for i, there := range present {
		if there {
			s.offsets = append(s.offsets, i)
		}
	}
	if spare := len(s.offsets) - width; spare > 0 {
		s.offsets = s.offsets[spare/2 : spare/2+width]
	}
	if len(s.offsets) > 0 {
		s.from = s.offsets[0]
	}
	return s
}

// load reads what is held of a stretch on the past dates, and sums it up.
func (g *fileGate) load(s *stretch, past []rules.Date) error {
	width := s.offsets[len(s.offsets)-1] - s.from + 1
	for _, d := range past {
		vals := make([]int64, width)
		ok, err := g.v.Fill(Returns, d, s.block, s.from, vals)
		if err != nil {
			return err
		}
		if !ok {
			fillMissing(vals)
		}
		s.past = append(s.past, vals)
	}
	s.before, s.typical = make([]int64, width), make([]typical, width)
	fillMissing(s.before)
	sizes := make([]int64, 0, len(past))
	for _, at := range s.offsets {
		sizes = s.sum(at-s.from, sizes[:0])
	}
	return nil
}

// sum finds the newest value, the typical size and the repeats of one series.
func (s *stretch) sum(i int, sizes []int64) []int64 {
	t := &s.typical[i]
	for _, row := range s.past {
		v := row[i]
		if v == Missing64 {
			continue
		}
		if v == s.before[i] && v != 0 {
			t.repeats++
		}
		s.before[i] = v
		sizes = append(sizes, max(v, -v))
	}
	t.held = len(sizes)
	if t.held > 0 {
		slices.Sort(sizes)
		t.size = (rules.Units(sizes[(t.held-1)/2]).Float() + rules.Units(sizes[t.held/2]).Float()) / 2
	}
	return sizes
}

// values are the file's values of a date beside what is held of their series; they are the newest from then on.
func (g *fileGate) values(sample []stretch, date rules.Date) (out []rules.Compared) {
	for i := range sample {
		s := &sample[i]
		d := dayOf(g.blocks, s.block, date)
		if d == nil {
			continue
		}
		vals := make([]int64, len(s.before))
		d.col.Fill(vals, s.from, rules.Places)
		for _, at := range s.offsets {
			k := at - s.from
			if vals[k] == Missing64 {
				continue
			}
			t := s.typical[k]
			out = append(out, rules.Compared{Return: rules.Units(vals[k]), Before: rules.Units(s.before[k]), Typical: t.size, Held: t.held, Repeats: t.repeats})
			s.before[k] = vals[k]
		}
	}
	return out
}

func dayOf(blocks []block, number uint32, date rules.Date) *day {
	b, ok := slices.BinarySearchFunc(blocks, number, func(b block, n uint32) int { return int(b.number) - int(n) })
	if !ok {
		return nil
	}
	i, ok := slices.BinarySearchFunc(blocks[b].days, date, func(d *day, at rules.Date) int { return int(d.date) - int(at) })
	if !ok {
		return nil
	}
	return blocks[b].days[i]
}

// priorRatios are the size ratios of the newest held dates, the newest first.
func priorRatios(sample []stretch, dates int) (out []float64) {
	for n := dates - 1; n >= max(0, dates-2); n-- {
		var values []rules.Compared
		for i := range sample {
			s := &sample[i]
			for _, at := range s.offsets {
				k := at - s.from
				values = append(values, rules.Compared{Return: rules.Units(s.past[n][k]), Typical: s.typical[k].size, Held: s.typical[k].held})
			}
		}
		ratio, _ := rules.SizeRatio(values)
		out = append(out, ratio)
	}
	return out
}
