package drill

import (
	"math/rand/v2"

	"strayd/rules"
)

// The sizes of what is planted.
const (
	missedAmount   = 0.008 // of the previous net asset value
	moveDeviations = 6
	moveAfter      = 10 // days
	spikeLeast     = 6  // deviations of a wrong price, and at most
	spikeMost      = 15
	referenceLeast = 2 // deviations of a wrong benchmark, and at most
	referenceMost  = 4
)

// splits are the new units per old.
var splits = []float64{2, 3, 4, 5, 10, 0.1}

// change makes the cells of one plant. It is the only place that knows what an error does to a number.
type change struct {
	book   *Book
	random *rand.Rand
	p      *Plant
	bad    bool // something needed is missing, does not fit, or nothing changes
}

// value is the true return of a series on a day of the plant.
func (c *change) value(day, series int) float64 {
	t := c.p.At + day
	if t < 0 || t >= len(c.book.Dates) || c.book.Values[t][series] == rules.Missing {
		c.bad = true
		return 0
	}
	return c.book.Values[t][series].Float()
}

// put plants a return, printed as the series prints.
func (c *change) put(day, series int, r float64) {
	u, ok := c.book.Series[series].print(r)
	t := c.p.At + day
	if !ok || c.bad || t >= len(c.book.Dates) {
		c.bad = true
		return
	}
	c.p.Cells = append(c.p.Cells, Cell{t, series, u})
}

// make fills in the cells; false when the error cannot be planted here, or would change nothing.
func (c *change) make() bool {
	switch natureOf(c.p.Kind).scope {
	case fileItself:
		return true
	case wholeFeed:
		c.feed()
	case oneHelper:
		c.reference()
	default:
		c.row()
	}
	return !c.bad && c.differs()
}

// differs says that something is changed on the first day that should show it.
func (c *change) differs() bool {
	for _, cell := range c.p.Cells {
		if cell.At == c.p.shows() && cell.Value != c.book.Values[cell.At][cell.Series] {
			return true
		}
	}
	return false
}

func (c *change) row() {
	s := c.p.Series
	switch c.p.Kind {
	case X100, X10000, X10, Div100, Sign:
		c.put(0, s, factorOf(c.p.Kind)*c.value(0, s))
	case Repeat:
		before := c.value(-1, s)
		c.bad = c.bad || before == 0
		c.put(0, s, before)
	case Zero:
		c.bad = c.value(-1, s) == 0
		c.put(0, s, 0)
	case MissedListed, MissedNot, Doubled:
		c.distribution()
	case Split, SplitListed:
		c.split()
	case Spike:
		c.spike()
	case Swapped:
		c.swap()
	case Cumulative:
		c.cumulative()
	case FXMissing, FXTwice:
		c.currency()
	case Move:
		c.move(0)
	case MoveAfter:
		c.put(0, s, 100*c.value(0, s))
		c.move(moveAfter)
	}
}

func factorOf(k Kind) float64 {
	return map[Kind]float64{X100: 100, X100File: 100, Div100: 0.01, Div100File: 0.01, X10000: 10_000, X10: 10, Sign: -1}[k]
}

// distribution leaves out or doubles a distribution d, a fraction of the previous net asset value: r - d, or r + d.
func (c *change) distribution() {
	d := missedAmount
	if c.p.Kind != MissedNot {
		c.list(distribution, d)
	}
	if c.p.Kind != Doubled {
		d = -d
	}
	c.put(0, c.p.Series, c.value(0, c.p.Series)+d)
}

func (c *change) list(kind string, amount float64) {
	c.p.Listed = append(c.p.Listed, rules.Event{Date: c.book.Dates[c.p.At], Series: c.book.Series[c.p.Series].ID, Kind: kind, Amount: amount})
}

// split leaves out a split of k new units per old: (1 + r)/k - 1.
func (c *change) split() {
	k := splits[c.random.IntN(len(splits))]
	if c.p.Kind == SplitListed {
		c.list(split, k)
	}
	c.put(0, c.p.Series, (1+c.value(0, c.p.Series))/k-1)
}

// spike is a wrong price on one day: the first return is off by 6 to 15 deviations, the second takes it back:
//
//	r1' = r1 + e,   r2' = (1 + r1)(1 + r2)/(1 + r1') - 1
func (c *change) spike() {
	dev, ok := c.book.deviation(c.p.At, c.p.Series)
	c.bad = !ok
	r1, r2 := c.value(0, c.p.Series), c.value(1, c.p.Series)
	off := r1 + c.direction()*dev*(spikeLeast+(spikeMost-spikeLeast)*c.random.Float64())
	c.bad = c.bad || off <= -0.9
	c.put(0, c.p.Series, off)
	c.put(1, c.p.Series, (1+r1)*(1+r2)/(1+off)-1)
}

func (c *change) direction() float64 {
	if c.random.IntN(2) == 0 {
		return -1
	}
	return 1
}

func (c *change) swap() {
	for day := range c.p.Days {
		mine, theirs := c.value(day, c.p.Series), c.value(day, c.p.Partner)
		c.put(day, c.p.Series, theirs)
		c.put(day, c.p.Partner, mine)
	}
}

// cumulative carries the product of (1 + r) since the first day, less 1.
func (c *change) cumulative() {
	sum := 1.0
	for day := range c.p.Days {
		sum *= 1 + c.value(day, c.p.Series)
		c.put(day, c.p.Series, sum-1)
	}
}

// currency divides by 1 + fx where the currency's return is missing, and multiplies where it is in twice.
func (c *change) currency() {
	fx := c.book.Series[c.p.Series].FX
	for day := range c.p.Days {
		r, by := c.value(day, c.p.Series), 1+c.value(day, fx)
		if c.p.Kind == FXMissing {
			by = 1 / by
		}
		c.put(day, c.p.Series, (1+r)*by-1)
	}
}

// move adds 6 deviations of the 60 observations before.
func (c *change) move(day int) {
	dev, ok := c.book.deviation(c.p.At+day, c.p.Series)
	c.bad = c.bad || !ok
	c.put(day, c.p.Series, c.value(day, c.p.Series)+c.direction()*moveDeviations*dev)
}

// reference puts a benchmark off by 2 to 4 of its deviations.
func (c *change) reference() {
	dev, ok := c.book.deviation(c.p.At, c.p.Series)
	c.bad = !ok
	off := c.direction() * dev * (referenceLeast + (referenceMost-referenceLeast)*c.random.Float64())
	c.put(0, c.p.Series, c.value(0, c.p.Series)+off)
}

// feed changes every value of a feed. A series without a value on a day stays without one.
func (c *change) feed() {
	shift := map[Kind]int{ShiftedFile: -1, EarlyFile: 1}[c.p.Kind]
	for day := range c.p.Days {
		if t := c.p.At + day + shift; t < 0 || t >= len(c.book.Dates) {
			c.bad = true
			return
		}
		for _, s := range c.book.of(c.p.Feed) {
			from := c.book.Values[c.p.At+day+shift][s]
			if from == rules.Missing || c.book.Values[c.p.At+day][s] == rules.Missing {
				continue
			}
			r := from.Float()
			if shift == 0 {
				r *= factorOf(c.p.Kind)
			}
			c.put(day, s, r)
		}
	}
	c.bad = c.bad || len(c.p.Cells) == 0
}
