package rules

import (
	"cmp"
	"slices"
	"time"
)

// AgeBands are the upper ends of the bands of age, in business days; the last band has none.
var AgeBands = []int{1, 5, 10}

// Ageing is what still asks something, by age.
type Ageing struct {
	Open        int
	Bands       []int // by AgeBands, then older
	PastReply   int   // nobody has even acknowledged them by their group's reply-by time
	Replies     int   // of those that have such a time
	PastRelease int
	Oldest      []Aged
}

// Aged is one flag that still asks something.
type Aged struct {
	Flag
	Days      int // business days since it was raised
	Owner     string
	PastReply bool
}

// mostOldest is how many of the oldest are named.
const mostOldest = 8

func (f *WeekFacts) ageing() (a Ageing) {
	today := f.today()
	a.Bands = make([]int, len(AgeBands)+1)
	for i := range f.Flags {
		g := &f.Flags[i]
		if !g.AsksOn(today) {
			continue
		}
		days := f.Calendar.Between(DateFrom(g.RaisedAt.In(f.Zone)), today)
		a.Open++
		band, _ := slices.BinarySearch(AgeBands, days)
		a.Bands[band]++
		aged := Aged{Flag: *g, Days: days, Owner: f.owner(g)}
		group := f.group(g.Group)
		if group.Reply > 0 {
			a.Replies++
			aged.PastReply = g.StandingOn(today) == Open && g.RaisedAt.Add(group.Reply).Before(f.Span.AsOf)
		}
		if aged.PastReply {
			a.PastReply++
		}
		if group.Release != nil && g.Date != NoDate && f.dueAt(*group.Release, g.Date).Before(f.Span.AsOf) {
			a.PastRelease++
		}
		a.Oldest = append(a.Oldest, aged)
	}
	slices.SortStableFunc(a.Oldest, func(x, y Aged) int { return x.RaisedAt.Compare(y.RaisedAt) })
	a.Oldest = slices.Clip(a.Oldest[:min(mostOldest, len(a.Oldest))])
	return a
}

func (f *WeekFacts) group(name string) Group {
	for _, g := range f.Groups {
		if g.Name == name && name != "" {
			return g
		}
	}
	return Group{}
}

// owner is who looks after a flag: the register's owner of its series, else the group's.
func (f *WeekFacts) owner(g *Flag) string {
	owner := ""
	if f.Owner != nil && g.Series != "" {
		owner = f.Owner(g.Series)
	}
	return cmp.Or(owner, f.group(g.Group).Owner)
}

func (f *WeekFacts) dueAt(due Due, d Date) time.Time { return DueAt(due, d, f.zoneOf(due)) }

func (f *WeekFacts) zoneOf(due Due) *time.Location {
	if due.Timezone != "" {
		if zone, err := time.LoadLocation(due.Timezone); err == nil {
			return zone
		}
	}
	return f.Zone
}

// Closed is what was decided in the week. A flag that was decided more than once counts as it was last.
type Closed struct {
	Decided, Genuine, Erroneous, Corrected int
	Reasons                                []ReasonCount
	MedianHours                            Num // from raised to decided
	Overridden                             []Override
	AsRoot                                 int // by the system's administrator
	SignedOff, Acknowledged, Accepted      int
	ByUs, ByProvider, ByClient             int // errors, by who found them
}

// ReasonCount counts decisions by reason.
type ReasonCount struct {
	Reason Reason
	Count  int
}

// Override is a flag that was closed as a market move although its residual is out of range.
type Override struct {
	Flag
	By   Person
	Note string
}

func (f *WeekFacts) closed() (c Closed) {
	last, byRef := f.lastDecisions(), f.byRef()
	for i := range f.Acts {
		e := &f.Acts[i]
		if !f.Span.During(e.At) {
			continue
		}
		switch e.Deed {
		case SignOff:
			c.SignedOff += len(e.Refs)
		case Acknowledge:
			c.Acknowledged += len(e.Refs)
		case Accept:
			c.Accepted++
		}
	}
	reasons, hours := map[Reason]int{}, []float64(nil)
	for _, ref := range sortedRefs(last) {
		e, g := last[ref], byRef[ref]
		c.Decided++
		reasons[e.Reason]++
		c.conclude(e, g)
		if g == nil {
			continue
		}
		hours = append(hours, e.At.Sub(g.RaisedAt).Hours())
		if e.Reason == MarketMove && e.Override != "" {
			c.Overridden = append(c.Overridden, Override{*g, e.By, e.Override})
		}
	}
	for _, r := range Reasons {
		c.Reasons = append(c.Reasons, ReasonCount{r, reasons[r]})
	}
	c.MedianHours = median(hours)
	return c
}

func sortedRefs(of map[uint64]*Entry) []uint64 {
	refs := make([]uint64, 0, len(of))
	for ref := range of {
		refs = append(refs, ref)
	}
	slices.Sort(refs)
	return refs
}

func (c *Closed) conclude(e *Entry, g *Flag) {
	if e.By.Root() {
		c.AsRoot++
	}
	switch e.Conclusion {
	case Genuine:
		c.Genuine++
		return
	case Corrected:
		c.Corrected++
	default:
		c.Erroneous++
	}
	switch finderOf(e, g) {
	case FoundByClient:
		c.ByClient++
	case FoundByProvider:
		c.ByProvider++
	default:
		c.ByUs++
	}
}

func median(v []float64) Num {
	slices.Sort(v)
	n := len(v)
	if n == 0 {
		return Num{}
	}
	return Some((v[(n-1)/2] + v[n/2]) / 2)
}

// Waivers are the flags that ask nothing for a while.
type Waivers struct {
	Live, Expiring int    // Expiring within waiverSoon business days
	Lapsed         []Flag // in the week, and not renewed
	Soon           []Flag
}

const waiverSoon = 5

func (f *WeekFacts) waivers() (w Waivers) {
	today := f.today()
	soon := f.Calendar.Add(today, waiverSoon)
	for i := range f.Flags {
		g := &f.Flags[i]
		if g.Last == nil || g.Last.Until == NoDate {
			continue
		}
		switch until := g.Last.Until; {
		case g.StandingOn(today) == Waived:
			w.Live++
			if until <= soon {
				w.Expiring++
				w.Soon = append(w.Soon, *g)
			}
		case g.AsksOn(today) && f.Span.Has(until):
			w.Lapsed = append(w.Lapsed, *g)
		}
	}
	return w
}
