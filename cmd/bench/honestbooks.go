package main

import (
	"fmt"
	"math"
	"math/rand/v2"
	"time"

	"strayd/rules"
	"strayd/rules/drill"
)

// habit is how an honest book moves: each return is
//
//	beta (now factor of the day + lag factor of the day before) + residual
//
// where a part of the residual is common to the group. The zero value of most fields is the plain case.
type habit struct {
	groups, size int
	factor, rest float64 // deviations, fractions
	common       float64 // share of the residual's variance that the group has in common
	lag          float64 // weight of the factor of the day before
	drift        float64 // a day
	places       int     // decimals of a per cent
	reference    string  // series, peers, or "" for none
	grouped      bool    // the register names groups
	beta         float64 // half the spread of slopes about 1
	closed       float64 // share of weekdays that are holidays without a file
	zeroed       float64 // share on which a group is at zero
	away         float64 // share on which a group has no values
	idle         float64 // share of series that move on the last date of a month only
	still        float64 // share of ordinary values that are exactly zero
	gaps         float64 // share of values that are missing
	young        float64 // share of series that begin late
	crash        float64 // deviations of one common fall
	louder       float64 // factor of the volatility in the second half
	days         int
}

// honestKind is one honest book.
type honestKind struct {
	name string
	make func(seed uint64) *drill.Book
}

func of(h habit) func(uint64) *drill.Book {
	return func(seed uint64) *drill.Book { return h.invent(seed) }
}

func honestBooks() []honestKind {
	plain := habit{groups: 4, size: 15, factor: 0.01, rest: 0.002, beta: 0.3, places: 2, reference: "series", grouped: true}
	with := func(change func(*habit)) func(uint64) *drill.Book {
		h := plain
		change(&h)
		return of(h)
	}
	return []honestKind{
		{"plain, two decimals", of(plain)},
		{"trackers of one index", with(func(h *habit) { h.groups, h.size, h.rest, h.places = 1, 60, 0.0002, 4 })},
		{"trackers, four indices", with(func(h *habit) { h.rest, h.places = 0.0002, 4 })},
		{"share classes of one fund", with(func(h *habit) { h.groups, h.size, h.rest, h.beta, h.reference = 1, 20, 0.00001, 0, "peers" })},
		{"money market, two decimals", with(func(h *habit) {
			h.groups, h.size, h.factor, h.rest, h.beta, h.drift, h.reference = 1, 30, 0.0003, 0.00005, 0.1, 0.0001, "peers"
		})},
		{"money market, four decimals", with(func(h *habit) {
			h.groups, h.size, h.factor, h.rest, h.drift, h.places, h.reference = 1, 30, 0.0001, 0.0001, 0.0001, 4, "peers"
		})},
		{"three bond funds", with(func(h *habit) {
			h.groups, h.size, h.factor, h.rest, h.reference, h.grouped = 1, 3, 0.0003, 0.0001, "", false
		})},
		{"six equity funds", with(func(h *habit) { h.groups, h.size, h.rest, h.reference, h.grouped = 1, 6, 0.0005, "", false })},
		{"common residuals", with(func(h *habit) { h.rest, h.common, h.places = 0.004, 0.7, 4 })},
		{"common residuals, one index", with(func(h *habit) { h.groups, h.size, h.rest, h.common = 1, 40, 0.006, 0.6 })},
		{"priced on yesterday, holidays", with(func(h *habit) { h.lag, h.closed = 0.5, 0.04 })},
		{"priced wholly on yesterday", with(func(h *habit) { h.lag, h.closed, h.groups, h.size = 1, 0.04, 2, 12 })},
		{"a crash", with(func(h *habit) { h.crash = 14 })},
		{"a crash of trackers", with(func(h *habit) { h.crash, h.groups, h.size, h.rest = 20, 1, 15, 0.0002 })},
		{"wild, no groups, six decimals", with(func(h *habit) {
			h.groups, h.size, h.factor, h.rest, h.places, h.reference, h.grouped = 10, 20, 0.03, 0.04, 6, "", false
		})},
		{"half valued once a month", with(func(h *habit) { h.idle = 0.5 })},
		{"regional holidays without values", with(func(h *habit) { h.away, h.reference = 0.04, "peers" })},
		{"regional holidays at zero", with(func(h *habit) { h.zeroed, h.reference = 0.04, "peers" })},
		{"illiquid: many zeros", with(func(h *habit) { h.still, h.places = 0.3, 4 })},
		{"three illiquid", with(func(h *habit) { h.groups, h.size, h.still, h.reference, h.grouped = 1, 3, 0.4, "", false })},
		{"gaps and new series", with(func(h *habit) { h.gaps, h.young = 0.03, 0.4 })},
		{"500 series, one group, peers", with(func(h *habit) { h.groups, h.size, h.rest, h.reference, h.days = 1, 500, 0.006, "peers", 400 })},
		{"short history", with(func(h *habit) { h.days = 90 })},
		{"volatility doubles", with(func(h *habit) { h.louder = 2.5 })},
		{"four open indices", openIndices},
	}
}

type inventor struct {
	habit
	r    *rand.Rand
	book *drill.Book
}

func (h habit) invent(seed uint64) *drill.Book {
	if h.days == 0 {
		h.days = 700
	}
	m := &inventor{h, rand.New(rand.NewPCG(seed, 0x686f6e657374)), &drill.Book{}}
	m.dates()
	for g := range h.groups {
		m.group(g)
	}
	return m.book
}

func (m *inventor) dates() {
	first, _ := rules.DateOf(2022, 1, 3)
	for d := first; len(m.book.Dates) < m.days; d++ {
		if w := d.Weekday(); w == time.Saturday || w == time.Sunday || m.r.Float64() < m.closed {
			continue
		}
		m.book.Dates = append(m.book.Dates, d)
		m.book.Values = append(m.book.Values, nil)
	}
}

// clustered are GARCH(1,1) numbers of a deviation with t5 shocks.
func (m *inventor) clustered(dev float64) []float64 {
	out := make([]float64, m.days)
	v := 1.0
	for t := range out {
		shock := math.Sqrt(v) * m.t5()
		out[t] = dev * shock
		if m.louder > 0 && t > m.days/2 {
			out[t] *= m.louder
		}
		v = 0.03 + 0.07*shock*shock + 0.90*v
	}
	return out
}

func (m *inventor) t5() float64 {
	chi := 0.0
	for range 5 {
		x := m.r.NormFloat64()
		chi += x * x
	}
	return m.r.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5)
}

func (m *inventor) add(s drill.Series, places int, returns []float64) {
	s.Tick = rules.Units(rules.Pow10(rules.Places - 2 - places))
	for t := range m.book.Values {
		u := rules.Missing
		if x := returns[t]; x == x {
			u = rules.Units(math.Round(x*1e15/float64(s.Tick))) * s.Tick
		}
		m.book.Values[t] = append(m.book.Values[t], u)
	}
	m.book.Series = append(m.book.Series, s)
}

// group adds a group with its index, where it has one.
func (m *inventor) group(g int) {
	factor, common := m.clustered(m.factor), m.clustered(m.rest*math.Sqrt(m.common))
	if m.crash > 0 {
		factor[m.days*3/4] = -m.crash * m.factor
	}
	name, reference := fmt.Sprintf("group-%d", g+1), -1
	if m.reference == "series" {
		reference = len(m.book.Series)
		m.add(drill.Series{ID: name + "-index", Feed: drill.BenchFeed, Reference: -1, FX: -1, Helper: true}, 4, factor)
	}
	zero, away := m.days0(m.zeroed), m.days0(m.away)
	for n := range m.size {
		s := drill.Series{ID: fmt.Sprintf("%s-%03d", name, n+1), Feed: drill.FundsFeed, Reference: reference, FX: -1, Peers: m.reference == "peers"}
		if m.grouped {
			s.Group = name
		}
		m.add(s, m.places, m.fund(factor, common, zero, away))
	}
}

// days0 draws days.
func (m *inventor) days0(share float64) []bool {
	out := make([]bool, m.days)
	for t := range out {
		out[t] = m.r.Float64() < share
	}
	return out
}

func (m *inventor) fund(factor, common []float64, zero, away []bool) []float64 {
	beta := 1 + m.beta*(2*m.r.Float64()-1)
	own := m.clustered(m.rest * math.Sqrt(1-m.common))
	idle := m.r.Float64() < m.idle
	begin := 0
	if m.r.Float64() < m.young {
		begin = m.r.IntN(m.days)
	}
	out := make([]float64, m.days)
	sum := 0.0
	for t := range out {
		before := 0.0
		if t > 0 {
			before = factor[t-1]
		}
		x := m.drift + beta*((1-m.lag)*factor[t]+m.lag*before) + common[t] + own[t]
		switch sum += x; {
		case t < begin, away[t], m.r.Float64() < m.gaps:
			x = math.NaN()
		case zero[t], m.r.Float64() < m.still:
			x = 0
		case idle && t+1 < m.days && m.book.Dates[t].Time().Month() == m.book.Dates[t+1].Time().Month():
			x = 0
		case idle:
			x, sum = sum, 0
		}
		out[t] = x
	}
	return out
}

// openIndices are the open index data as a book of their own.
func openIndices(seed uint64) *drill.Book {
	m := &inventor{habit{days: 1500}, rand.New(rand.NewPCG(seed, 1)), &drill.Book{}}
	factors, err := indexFactors(indexData, seed, m.days)
	if err != nil {
		return m.book
	}
	m.dates()
	for n, f := range factors {
		m.add(drill.Series{ID: fmt.Sprintf("index-%d", n+1), Feed: drill.FundsFeed, Reference: -1, FX: -1}, 4, f)
	}
	return m.book
}
