package drill

import (
	"math/rand/v2"

	"strayd/rules"
)

// Options say what is drawn.
type Options struct {
	Seed  uint64
	Kinds []Kind // nil for every kind
	From  int    // index of the first date that may hold a plant
	Gap   int    // business days at least between two plants of one series; 0 for 60
	Most  int    // plants of one kind; 0 for as many as there is room for
}

const (
	plainGap    = 60
	shiftGap    = 40 // after a file that was shifted for days
	fileGap     = 6  // after a file that was wrong on one day
	helperGap   = 20 // between two wrong benchmarks
	oldHistory  = 250
	dayOffset   = 0x706c616e
	mostPartner = 20 // tries to find a partner to be exchanged with
)

// Rounds splits kinds into those that can share a run: rows; whole files on one day, which touch every series; and whole files over days,
// which need much room. A round is never empty.
func Rounds(kinds []Kind) (rounds [][]Kind) {
	var of [3][]Kind
	for _, k := range kinds {
		switch {
		case k.File() && k.Lasting():
			of[2] = append(of[2], k)
		case k.File():
			of[1] = append(of[1], k)
		default:
			of[0] = append(of[0], k)
		}
	}
	for _, r := range of {
		if len(r) > 0 {
			rounds = append(rounds, r)
		}
	}
	return rounds
}

// drawer draws one plan.
type drawer struct {
	Options
	book   *Book
	fits   *Fits
	random *rand.Rand
	free   []int            // by series: the first date that may hold its next plant
	busy   map[string]int   // by group: the last date of its newest plant
	quiet  map[string]int   // by feed: the first date that may hold its next plant
	counts map[Kind]int     // drawn so far
	listed map[string][]int // by series: dates of its distributions in the calendar
	plan   *Plan
}

// Draw draws the plants of a run. Kinds of rows and of whole files disturb each other: draw them in Rounds.
//
// Of the kinds that a place allows, the one that was drawn least so far is taken, so that all come to about the same number. At most one
// plant lies in a group on a date.
func Draw(b *Book, f *Fits, o Options) *Plan {
	if o.Kinds == nil {
		o.Kinds = Kinds
	}
	if o.Gap == 0 {
		o.Gap = plainGap
	}
	d := &drawer{Options: o, book: b, fits: f, random: rand.New(rand.NewPCG(o.Seed, dayOffset)), free: make([]int, len(b.Series)),
		busy: map[string]int{}, quiet: map[string]int{}, counts: map[Kind]int{}, plan: &Plan{Seed: o.Seed, From: o.From}}
	d.calendar()
	for s := range d.free {
		d.free[s] = o.From + d.random.IntN(o.Gap)
		if b.Series[s].Helper {
			d.free[s] = o.From + d.random.IntN(helperGap)
		}
	}
	for t := o.From; t < len(b.Dates); t++ {
		d.files(t)
		for _, s := range d.random.Perm(len(b.Series)) {
			if d.free[s] <= t && d.idle(s, t) {
				d.row(s, t)
			}
		}
	}
	return d.plan
}

func (d *drawer) calendar() {
	d.listed = map[string][]int{}
	at := map[rules.Date]int{}
	for t, date := range d.book.Dates {
		at[date] = t
	}
	for _, e := range d.book.Events {
		if t, ok := at[e.Date]; ok {
			d.listed[e.Series] = append(d.listed[e.Series], t)
		}
	}
}

// files may plant something in the file of each feed.
func (d *drawer) files(t int) {
	for _, feed := range d.book.Feeds() {
		if d.quiet[feed] > t {
			continue
		}
		p := Plant{Series: -1, Partner: -1, Feed: feed, At: t}
		if k, ok := d.choose(&p, func(k Kind) bool { return k.File() }); ok {
			gap := fileGap
			if k.Lasting() {
				gap = shiftGap
			}
			d.quiet[feed] = p.last() + gap + d.random.IntN(fileGap)
		}
	}
}

// row may plant something in a series.
func (d *drawer) row(s, t int) {
	p := Plant{Series: s, Partner: -1, Feed: d.book.Series[s].Feed, At: t}
	k, ok := d.choose(&p, func(k Kind) bool { return d.allows(k, s, t) })
	if !ok {
		return
	}
	gap := d.Gap + d.random.IntN(d.Gap/2+1)
	if k == ReferenceBad {
		gap = helperGap + d.random.IntN(helperGap)
		for _, f := range d.book.followers(s) {
			d.occupy(f, p.last())
			d.free[f] = max(d.free[f], p.last()+2)
		}
	}
	for _, of := range []int{p.Series, p.Partner} {
		if of >= 0 {
			d.free[of] = p.last() + gap
			d.occupy(of, p.last())
		}
	}
}

// choose plants the rarest of the kinds that fit, in an order drawn anew, and says which.
func (d *drawer) choose(p *Plant, fits func(Kind) bool) (Kind, bool) {
	var fit []Kind
	for _, i := range d.random.Perm(len(d.Kinds)) {
		if k := d.Kinds[i]; fits(k) && (d.Most == 0 || d.counts[k] < d.Most) {
			fit = append(fit, k)
		}
	}
	for len(fit) > 0 {
		least := 0
		for i, k := range fit {
			if d.counts[k] < d.counts[fit[least]] {
				least = i
			}
		}
		k := fit[least]
		if d.place(k, p) {
			return k, true
		}
		fit = append(fit[:least], fit[least+1:]...)
	}
	return "", false
}

// place plants a kind at p, if it can be.
func (d *drawer) place(k Kind, p *Plant) bool {
	q := *p
	q.Kind, q.Days = k, natureOf(k).days
	if q.last()+1 >= len(d.book.Dates) {
		return false
	}
	if k == Swapped {
		if q.Partner = d.partner(q.Series, q.At); q.Partner < 0 {
			return false
		}
	}
	if k == TruncatedFile {
		q.Keep, q.Torn = 0.5+0.4*d.random.Float64(), d.random.IntN(2) == 0
	}
	c := &change{book: d.book, random: d.random, p: &q}
	if !c.make() {
		return false
	}
	d.left(&q)
	*p = q
	d.counts[k]++
	d.plan.Plants = append(d.plan.Plants, q)
	return true
}

func (d *drawer) left(p *Plant) {
	for _, c := range p.Cells {
		if c.At == p.shows() && c.Series == p.Series {
			p.Left = d.fits.Left(c.At, c.Series, c.Value)
		}
	}
}

// partner finds a series of another group of the same feed to be exchanged with, or -1.
func (d *drawer) partner(s, t int) int {
	mine := &d.book.Series[s]
	for range mostPartner {
		i := d.random.IntN(len(d.book.Series))
		other := &d.book.Series[i]
		if !other.Helper && other.Group != mine.Group && other.Feed == mine.Feed && other.Tick == mine.Tick && d.free[i] <= t+d.Gap/2 && d.idle(i, t) {
			return i
		}
	}
	return -1
}

// idle says that nothing is planted in the group of a series on a date or just before.
func (d *drawer) idle(s, t int) bool {
	group := d.book.Series[s].Group
	last, ok := d.busy[group]
	return group == "" || !ok || t > last
}

func (d *drawer) occupy(s, last int) {
	group := d.book.Series[s].Group
	d.busy[group] = max(d.busy[group], last)
}

// allows says whether a kind of row can be planted in a series.
func (d *drawer) allows(k Kind, s, t int) bool {
	of := &d.book.Series[s]
	switch {
	case k.File(), of.Helper != (natureOf(k).scope == oneHelper):
		return false
	case k == ReferenceBad:
		return len(d.book.followers(s)) > 0 && d.groupsIdle(s, t)
	case k == FXMissing, k == FXTwice:
		return of.FX >= 0
	case k == MissedListed, k == MissedNot, k == Doubled, k == Split, k == SplitListed:
		return !d.near(of.ID, t) && (k != MissedNot || t >= oldHistory)
	}
	return true
}

// groupsIdle says that nothing is planted in the followers of a benchmark.
func (d *drawer) groupsIdle(reference, t int) bool {
	for _, f := range d.book.followers(reference) {
		if !d.idle(f, t) {
			return false
		}
	}
	return true
}

// near says that the calendar lists something for a series within two days.
func (d *drawer) near(id string, t int) bool {
	for _, at := range d.listed[id] {
		if at-2 <= t && t <= at+2 {
			return true
		}
	}
	return false
}
