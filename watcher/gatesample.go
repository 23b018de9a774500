package watcher

import (
	"slices"

	"strayd/rules"
)

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
	size                 float64
	held, repeats, zeros int
	tick                 rules.Units // the last digit of its values, down from a thousandth
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
	t.tick = rules.One / 1000
	for _, row := range s.past {
		v := row[i]
		if v == Missing64 {
			continue
		}
		if v == 0 {
			t.zeros++
		}
		for v%int64(t.tick) != 0 {
			t.tick /= 10
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
			c := t.compared(vals[k])
			c.Before = rules.Units(s.before[k])
			out = append(out, c)
			s.before[k] = vals[k]
		}
	}
	return out
}

// compared is a value beside what is held of its series.
func (t *typical) compared(v int64) rules.Compared {
	return rules.Compared{Return: rules.Units(v), Before: rules.Missing, Typical: t.size, Held: t.held, Repeats: t.repeats, Zeros: t.zeros, Tick: t.tick}
}

// pastOf gives what is held of the series of the values of a date, as they stand in values.
func (g *fileGate) pastOf(sample []stretch, date rules.Date) func(n int) []rules.Units {
	var of []place
	return func(n int) (out []rules.Units) {
		if of == nil {
			of = g.places(sample, date)
		}
		for _, row := range of[n].stretch.past {
			out = append(out, rules.Units(row[of[n].at]))
		}
		return out
	}
}

// place is a series of a stretch.
type place struct {
	stretch *stretch
	at      int
}

// places lists the series that have a value on a date, in the order of values.
func (g *fileGate) places(sample []stretch, date rules.Date) (of []place) {
	for i := range sample {
		d := dayOf(g.blocks, sample[i].block, date)
		if d == nil {
			continue
		}
		for _, at := range sample[i].offsets {
			if at < d.col.Len() && d.col.has(at) {
				of = append(of, place{&sample[i], at - sample[i].from})
			}
		}
	}
	return of
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
				values = append(values, s.typical[k].compared(s.past[n][k]))
			}
		}
		ratio, _ := rules.SizeRatio(values)
		out = append(out, ratio)
	}
	return out
}

// zeroReach is how many dates back a day of nothing but zeros is looked for: a year of holidays.
const zeroReach = 260

// zeroDays says that a file is refused for being all zeros, and that such days were taken before: its holidays come so.
func (g *fileGate) zeroDays(r *rules.Refusal, sample []stretch, date rules.Date) (bool, error) {
	if r.LooksLike != rules.CauseZero {
		return false, nil
	}
	n, _ := slices.BinarySearch(g.j.held, date)
	for _, d := range g.j.held[max(0, n-zeroReach):n] {
		if all, err := g.allZero(&sample[0], d); all || err != nil {
			return all, err
		}
	}
	return false, nil
}

// allZero says that most series of a stretch have a value on a date, and that all of these are zero.
func (g *fileGate) allZero(s *stretch, date rules.Date) (bool, error) {
	vals := make([]int64, s.offsets[len(s.offsets)-1]-s.from+1)
	ok, err := g.v.Fill(Returns, date, s.block, s.from, vals)
	if !ok || err != nil {
		return false, err
	}
	there := 0
	for _, at := range s.offsets {
		switch v := vals[at-s.from]; v {
		case Missing64:
		case 0:
			there++
		default:
			return false, nil
		}
	}
	return 2*there > len(s.offsets), nil
}
