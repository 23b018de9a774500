package watcher

import (
	"math"
	"slices"

	"strayd/rules"
	"strayd/stats"
)

const (
	// shiftDates is how many held dates the lines on the references are drawn from, and shiftSeries how many series are looked at.
	shiftDates, shiftSeries = 120, 256
	// openDays is how many business days before the date are looked through for where a shift can have begun.
	openDays = 10
	// oddSize is how many times its usual size a reference must be to be out of line itself: about seven deviations.
	oddSize = 10
)

// follow is one series of the file with a reference that it does not bring itself.
type follow struct{ series, reference uint32 }

// shift holds the file's newest date against references of other feeds: do its values belong to the date before? A shift begins with a
// date on which the values of the one before stood once more, or with a file that was refused for that: without such a date in the last
// days there is none.
func (g *fileGate) shift() (*rules.Refusal, error) {
	last := g.sheet.Last()
	n, _ := slices.BinarySearch(g.j.held, last)
	if n < rules.TypicalDates || g.j.members.Lone() || g.p.Settings.CalendarFor("").Between(g.j.held[n-1], last) > openDays {
		return nil, nil
	}
	pairs := g.followers(last)
	if len(pairs) == 0 {
		return nil, nil
	}
	grid := newGrid(g.v, append(slices.Clone(g.j.held[max(0, n-shiftDates):n]), last))
	for _, p := range pairs {
		if err := errorOf(grid.add(p.series), grid.add(p.reference)); err != nil {
			return nil, err
		}
	}
	for _, p := range pairs {
		g.overlay(grid.of(p.series), last, p.series)
	}
	g.j.odd = grid.odd(pairs)
	before := grid.newestWith(pairs)
	if before < 0 || !g.opening(grid, pairs, last) {
		return nil, nil
	}
	return rules.RefuseShift(last, grid.dates[before], grid.byReference(pairs, before)), nil
}

func errorOf(a, b error) error {
	if a != nil {
		return a
	}
	return b
}

// followers lists the held series of the file on its newest date that have a reference in the ledger which the file does not bring, in
// the order of their numbers.
func (g *fileGate) followers(last rules.Date) (out []follow) {
	names := map[string]int64{} // number of a reference, -1 where it has none or the file brings it
	brings := func(id uint32) bool {
		return slices.ContainsFunc(g.sheet.Columns, func(c *Column) bool {
			return c.Date == last && c.Block == id/BlockSize && int(id%BlockSize) < c.Len() && c.has(int(id%BlockSize))
		})
	}
	for _, b := range g.blocks {
		d := dayOf(g.blocks, b.number, last)
		if d == nil {
			continue
		}
		for i := range d.col.Len() {
			id := b.number*BlockSize + uint32(i)
			if !d.col.has(i) || int(id) >= g.j.heldNames {
				continue
			}
			name := g.name(id)
			reference := g.j.members.Reference(name, g.j.members.Group(name))
			if reference == "" || reference == rules.PeersReference {
				continue
			}
			if _, ok := names[reference]; !ok {
				at, known := g.j.names.Find([]byte(reference))
				names[reference] = -1
				if known && int(at) < g.j.heldNames && !brings(at) {
					names[reference] = int64(at)
				}
			}
			if at := names[reference]; at >= 0 {
				out = append(out, follow{id, uint32(at)})
			}
			if len(out) == shiftSeries {
				return out
			}
		}
	}
	return out
}

// overlay puts the file's value of the newest date over what is held of a series.
func (g *fileGate) overlay(row []int64, last rules.Date, id uint32) {
	if d := dayOf(g.blocks, id/BlockSize, last); d != nil {
		d.col.Fill(row[len(row)-1:], int(id%BlockSize), rules.Places)
	}
}

// opening says whether a shift can have begun in the last days: on a business day without values of most of the series, or with those of
// the date before.
func (g *fileGate) opening(grid *grid, pairs []follow, last rules.Date) bool {
	days := g.p.Settings.CalendarFor("")
	from := days.Add(last, -openDays)
	for d := from; d < last; d = days.Add(d, 1) {
		at, held := slices.BinarySearch(grid.dates, d)
		if !held || at == 0 {
			return true
		}
		there, same := 0, 0
		for _, p := range pairs {
			row := grid.of(p.series)
			if row[at] != Missing64 {
				there++
			}
			if row[at] != Missing64 && row[at] != 0 && row[at] == row[at-1] {
				same++
			}
		}
		if 2*there < len(pairs) || 2*same > there {
			return true
		}
	}
	return false
}

// grid is what is held of some series on some dates.
type grid struct {
	v      View
	dates  []rules.Date
	blocks map[uint32][][]int64 // by date
	rows   map[uint32][]int64   // by series, then date
}

func newGrid(v View, dates []rules.Date) *grid {
	return &grid{v: v, dates: dates, blocks: map[uint32][][]int64{}, rows: map[uint32][]int64{}}
}

// add reads a series.
func (g *grid) add(id uint32) error {
	if g.rows[id] != nil {
		return nil
	}
	block := g.blocks[id/BlockSize]
	if block == nil {
		for _, d := range g.dates {
			vals := make([]int64, BlockSize)
			ok, err := g.v.Fill(Returns, d, id/BlockSize, 0, vals)
			if err != nil {
				return err
			}
			if !ok {
				fillMissing(vals)
			}
			block = append(block, vals)
		}
		g.blocks[id/BlockSize] = block
	}
	row := make([]int64, len(g.dates))
	for n, vals := range block {
		row[n] = vals[id%BlockSize]
	}
	g.rows[id] = row
	return nil
}

func (g *grid) of(id uint32) []int64 { return g.rows[id] }

// odd lists the references whose value on the last date is many times their usual size.
func (g *grid) odd(pairs []follow) map[uint32]bool {
	out := map[uint32]bool{}
	for _, p := range pairs {
		row := g.of(p.reference)
		now, past := row[len(row)-1], row[:len(row)-1]
		var sizes []float64
		for _, v := range past[max(0, len(past)-rules.TypicalDates):] {
			if v != Missing64 {
				sizes = append(sizes, math.Abs(float64(v)))
			}
		}
		if usual, ok := stats.Median(sizes); ok && now != Missing64 && math.Abs(float64(now)) > oddSize*usual {
			out[p.reference] = true
		}
	}
	return out
}

// newestWith is the newest date before the last on which a reference has a value, -1 when there is none.
func (g *grid) newestWith(pairs []follow) int {
	for n := len(g.dates) - 2; n >= 0; n-- {
		for _, p := range pairs {
			if g.of(p.reference)[n] != Missing64 {
				return n
			}
		}
	}
	return -1
}

// byReference draws the line of every follower whose reference has a value on the last date and on the two before.
func (g *grid) byReference(pairs []follow, before int) []rules.Followers {
	var out []*followers
	at := map[uint32]int{}
	last := len(g.dates) - 1
	for _, p := range pairs {
		y, x := g.of(p.series), g.of(p.reference)
		if before < 1 || y[last] == Missing64 || x[last] == Missing64 || x[before] == Missing64 || x[before-1] == Missing64 {
			continue
		}
		n, known := at[p.reference]
		if !known {
			n = len(out)
			at[p.reference] = n
			out = append(out, &followers{sum: make([]float64, last), counted: make([]int, last)})
		}
		out[n].add(x, y, before)
	}
	var all []rules.Followers
	for _, f := range out {
		f.Alike = f.alike()
		all = append(all, f.Followers)
	}
	return all
}

// followers gathers those of one reference, with the sum of their residuals by date.
type followers struct {
	rules.Followers
	sum     []float64
	counted []int
}

// add draws the line of one of them, where there are dates enough.
func (f *followers) add(x, y []int64, before int) {
	last := len(f.sum)
	var list []rules.Pair
	on := make([]int, 0, last)
	for n := 1; n < last; n++ {
		if x[n] != Missing64 && x[n-1] != Missing64 && y[n] != Missing64 {
			list = append(list, rules.Pair{X: fraction(x[n]), Before: fraction(x[n-1]), Y: fraction(y[n])})
			on = append(on, n)
		}
	}
	line, ok := rules.Fit(list)
	if !ok {
		return
	}
	f.List = append(f.List, rules.Follower{Return: fraction(y[last]), Here: fraction(x[last]), Before: fraction(x[before]), Earlier: fraction(x[before-1]),
		Line: line})
	if line.Deviation <= 0 {
		return
	}
	for k, p := range list {
		z := (p.Y - line.At(p.X, p.Before)) / line.Deviation
		f.sum[on[k]] += min(max(z, -farResidual), farResidual)
		f.counted[on[k]]++
	}
}

// farResidual is how many deviations a residual counts for at most.
const farResidual = 4

func fraction(v int64) float64 { return rules.Units(v).Float() }

// alike is the mean square of the mean residual of a date.
func (f *followers) alike() float64 {
	n, square := 0, 0.0
	for t, of := range f.counted {
		if of > 0 {
			mean := f.sum[t] / float64(of)
			n, square = n+1, square+float64(mean*mean)
		}
	}
	return square / float64(max(n, 1))
}
