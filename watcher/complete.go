package watcher

import (
	"slices"
	"strings"

	"strayd/rules"
)

const (
	// keptFiles is how many of a feed's newest files are remembered, so that each of a few names that take turns has enough.
	keptFiles = 100
	// presenceCells bounds how much is read to know who is expected, and fewestFiles how little: of very many series fewer files are asked.
	presenceCells, fewestFiles = 4 << 20, 5
	// manySeries is from how many series on a file that lacks none of the day before is not looked at further.
	manySeries = 50_000
)

// noteTaken remembers an accepted file that brought something new.
func (p *Pass) noteTaken(r FileRow) {
	if r.Outcome != Accepted || r.Counts.New == 0 {
		return
	}
	list := append(p.taken[r.File.Feed], r)
	if len(list) > 2*keptFiles {
		list = slices.Clone(list[len(list)-keptFiles:])
	}
	p.taken[r.File.Feed] = list
}

// lastTaken is the newest date that a feed brought, NoDate when it brought none.
func (p *Pass) lastTaken(feed string) rules.Date {
	last := rules.NoDate
	for _, r := range p.taken[feed] {
		last = max(last, r.Last)
	}
	return last
}

// stem is a file's name without digits: files of one stem are deliveries of the same kind.
func stem(name string) string {
	return strings.Map(func(r rune) rune {
		if r >= '0' && r <= '9' {
			return -1
		}
		return r
	}, name)
}

// delivered is one file of a feed, or one date of it, by the steps that brought it.
type delivered struct {
	date  rules.Date
	steps map[uint32]bool
	rows  int
}

// before are the feed's newest files of the same kind. While there are too few, such as after a first load, its newest dates stand for
// them, which do not tell whether a date comes in one file.
func (g *fileGate) before(last rules.Date) (list []delivered, files bool) {
	most := min(rules.DeliveryFiles, max(fewestFiles, presenceCells/max(1, g.j.heldNames)))
	taken := g.p.taken[g.feed.Name]
	all := map[uint32]bool{}
	for i := len(taken) - 1; i >= 0; i-- {
		r := &taken[i]
		all[r.Step] = true
		if len(list) < most && stem(r.File.Name) == stem(g.sheet.File.Name) {
			list = append(list, delivered{r.Last, map[uint32]bool{r.Step: true}, r.Counts.Rows})
		}
	}
	if len(list) >= fewestFiles {
		return list, true
	}
	list = list[:0]
	n, _ := slices.BinarySearch(g.j.held, last)
	for i := n - 1; i >= 0 && len(list) < most; i-- {
		list = append(list, delivered{g.j.held[i], all, 0})
	}
	return list, false
}

// unended notes on an accepted file that its last line has no newline. endingFiles is how many files before, all with one, make that odd.
const (
	unended     = "no newline at the end"
	endingFiles = 3
)

// ending refuses a file that stops within a line, as those before did not.
func (g *fileGate) ending() (*rules.Refusal, error) {
	if !g.endsUnlike(endingFiles) {
		return nil, nil
	}
	return rules.RefuseUnended(g.sheet.Last()), nil
}

// endsUnlike says that the file stops within a line, and that at least so many files before did not.
func (g *fileGate) endsUnlike(files int) bool {
	taken := g.p.taken[g.feed.Name]
	return g.sheet.Unended && len(taken) >= files && !slices.ContainsFunc(taken, func(r FileRow) bool { return r.Reason == unended })
}

// completeness looks for who is missing: a file that breaks off is refused, one that lacks series raises a flag with their names.
func (g *fileGate) completeness() (*rules.Refusal, error) {
	last := g.sheet.Last()
	if last == rules.NoDate || g.p.Settings.CalendarFor("").Between(last, g.p.lastTaken(g.feed.Name)) > lookBack {
		return nil, nil
	}
	if g.j.heldNames >= manySeries {
		if whole, err := g.likeBefore(last); whole || err != nil {
			return nil, err
		}
	}
	list, files := g.before(last)
	came, before, err := g.came(list)
	if err != nil || len(before) < fewestFiles {
		return nil, err
	}
	d, err := g.delivery(before, came, last)
	if err != nil {
		return nil, err
	}
	if !files && 2*d.Missing.Count > d.Expected { // a date may come in parts
		if g.endsUnlike(1) {
			return rules.RefuseUnended(last), nil
		}
		return nil, nil
	}
	if r := d.Refuse(); r != nil && files && !g.p.Released[g.sheet.File.SHA256] {
		return r, nil
	}
	if err := g.skipped(before, came); err != nil {
		return nil, err
	}
	if note := d.Note(); note != "" {
		g.flags = append(g.flags, g.missing(last, note))
	}
	return nil, nil
}

// likeBefore says of a very large file that it lacks none of the series that have a value on the date before, which the feed brought:
// then nobody is looked for further back.
func (g *fileGate) likeBefore(last rules.Date) (bool, error) {
	n, _ := slices.BinarySearch(g.j.held, last)
	if n == 0 || g.p.lastTaken(g.feed.Name) != g.j.held[n-1] || g.p.Settings.CalendarFor("").Between(g.j.held[n-1], last) > 1 {
		return false, nil
	}
	columns := map[uint32]*Column{}
	for i := len(g.sheet.Columns) - 1; i >= 0 && g.sheet.Columns[i].Date == last; i-- {
		columns[g.sheet.Columns[i].Block] = g.sheet.Columns[i]
	}
	before, now := make([]int64, BlockSize), make([]int64, BlockSize)
	for _, bl := range allBlocks(g.j.heldNames, rules.NoDate) {
		ok, err := g.v.Fill(Returns, g.j.held[n-1], bl.number, 0, before[:bl.series])
		if err != nil {
			return false, err
		}
		c := columns[bl.number]
		if !ok {
			continue
		}
		if c == nil {
			return false, nil
		}
		c.Fill(now[:bl.series], 0, g.sheet.What.Places())
		for i, v := range before[:bl.series] {
			if now[i] == Missing64 && v != Missing64 {
				return false, nil
			}
		}
	}
	return true, nil
}

// came counts by series in how many of the files or dates it had a value. It gives back those that had any.
func (g *fileGate) came(list []delivered) (came []uint8, any []delivered, err error) {
	came = make([]uint8, g.j.heldNames)
	for _, e := range list {
		n := 0
		for _, bl := range allBlocks(g.j.heldNames, rules.NoDate) {
			counts := came[int(bl.number)*BlockSize:][:bl.series]
			err := g.v.Layers(Returns, e.date, bl.number, func(step uint32, vals []int64) error {
				if e.steps[step] {
					n += countUp(counts, vals)
				}
				return nil
			})
			if err != nil {
				return nil, nil, err
			}
		}
		if n > 0 {
			any = append(any, e)
		}
	}
	return came, any, nil
}

// countUp adds one for every value, and says how many there are.
func countUp(counts []uint8, vals []int64) (n int) {
	for i, v := range vals[:min(len(vals), len(counts))] {
		if v != Missing64 {
			counts[i]++
			n++
		}
	}
	return n
}

// delivery holds the file against who came before.
func (g *fileGate) delivery(before []delivered, came []uint8, last rules.Date) (*rules.Delivery, error) {
	d := &rules.Delivery{Date: last, Rows: g.sheet.Rows, Idle: len(g.blocks) == 0, Chance: 1}
	for _, e := range before {
		if e.rows > 0 {
			d.Before = append(d.Before, e.rows)
		}
	}
	newest, first := -1, -1 // the last expected series that is there, and the first that is missing
	for _, bl := range allBlocks(g.j.heldNames, rules.NoDate) {
		here, held := make([]bool, bl.series), make([]int64, bl.series)
		for _, c := range g.sheet.Columns {
			if c.Date == last && c.Block == bl.number {
				mark(here, c)
			}
		}
		if ok, err := g.v.Fill(Returns, last, bl.number, 0, held); err != nil {
			return nil, err
		} else if !ok {
			fillMissing(held)
		}
		for i := range here {
			id := int(bl.number)*BlockSize + i
			if !rules.Regular(int(came[id]), len(before)) || !here[i] && held[i] == Missing64 && !g.p.Settings.Expects(g.name(uint32(id)), last) {
				continue
			}
			d.Expected++
			switch {
			case here[i] || held[i] != Missing64:
				newest = id
			default:
				d.Missing.Add(g.name(uint32(id)))
				d.Chance *= rules.Absence(int(came[id]), len(before))
				if first < 0 {
					first = id
				}
			}
		}
	}
	if d.Tail = first > newest && newest >= 0; d.Tail {
		d.Last, d.Whole = g.name(uint32(newest)), g.wholeGroups(newest, came, len(before))
	}
	return d, nil
}

// wholeGroups says that the series which follow the last one that came are those of whole groups: it may be a holiday of theirs.
func (g *fileGate) wholeGroups(newest int, came []uint8, files int) bool {
	m := g.j.members
	if m.Groupless() {
		return false
	}
	absent := map[string]bool{}
	for id := newest + 1; id < len(came); id++ {
		if rules.Regular(int(came[id]), files) {
			absent[m.Group(g.name(uint32(id)))] = true
		}
	}
	for id := 0; id <= newest; id++ {
		if rules.Regular(int(came[id]), files) && absent[m.Group(g.name(uint32(id)))] {
			return false
		}
	}
	return !absent[""]
}

// mark notes which of a block's series have a value.
func mark(here []bool, c *Column) {
	for i := range min(len(here), c.Len()) {
		here[i] = here[i] || c.has(i)
	}
}

// missing is the flag of a file that lacks series.
func (g *fileGate) missing(date rules.Date, note string) *FlagRow {
	f := &FlagRow{SeriesID: NoSeries, New: true}
	f.RaisedAt, f.Date, f.Kind, f.Standing, f.Return = g.j.now, date, rules.KindMissing, rules.Open, rules.Missing
	f.Feed, f.File, f.Note = g.feed.Name, g.sheet.File.Name, note
	return f
}
