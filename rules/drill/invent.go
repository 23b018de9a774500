package drill

import (
	"fmt"
	"math"
	"math/rand/v2"
	"time"

	"strayd/rules"
)

// Invention says which book to invent. The zero value is the plain book: 60 funds in four groups of 15, the first two groups with a
// benchmark in another feed, the others with peers only, over 750 business days.
type Invention struct {
	Seed    uint64
	Days    int         // business days; 0 for 750, or for as many as Factors has where they are fewer
	Factors [][]float64 // returns of the groups' factors, fractions, by group then date; nil to invent four
	FX      bool        // every second fund has a foreign currency, whose return is a series of the benchmarks' feed
	// First is the first date; 0 for Monday 2023-01-02. Weekends are left out.
	First rules.Date
}

// The feeds of an invented book.
const (
	FundsFeed = "administrator"
	BenchFeed = "index"
)

const (
	groupSize    = 15
	groupCount   = 4
	plainDays    = 750
	factorDev    = 0.01  // of a group's factor, a day
	fxDev        = 0.005 // of a currency
	currency     = "currency"
	percentPoint = rules.One / 100
)

// GroupNames are the groups of an invented book, in order.
var GroupNames = []string{"north", "south", "east", "west"}

// maker invents one book.
type maker struct {
	Invention
	random *rand.Rand
	book   *Book
}

// Invent makes a book of invented returns. Each fund's return is
//
//	r = beta x factor of the group + residual
//
// with beta between 0.6 and 1.3 and a residual deviation of 0.15 % for half and 0.3 % for half, printed in per cent with two decimals
// for half and four for half. Factors and residuals are GARCH(1,1) (Bollerslev 1986) with Student t5 shocks. Returns are total returns:
// the distributions that the calendar lists, about four a year and fund, do not show in them.
func Invent(i Invention) *Book {
	m := &maker{Invention: i, random: rand.New(rand.NewPCG(i.Seed, 0x6272616e6368)), book: &Book{}}
	m.defaults()
	m.dates()
	m.helpers()
	m.funds()
	m.events()
	return m.book
}

func (m *maker) defaults() {
	if m.Days == 0 {
		m.Days = plainDays
	}
	if m.First == 0 {
		m.First, _ = rules.DateOf(2023, 1, 2)
	}
	if m.Factors == nil {
		for range groupCount {
			m.Factors = append(m.Factors, m.clustered(m.Days, factorDev, 0.08, 0.90))
		}
	}
	for _, f := range m.Factors {
		m.Days = min(m.Days, len(f))
	}
}

func (m *maker) dates() {
	for d := m.First; len(m.book.Dates) < m.Days; d++ {
		if w := d.Weekday(); w != time.Saturday && w != time.Sunday {
			m.book.Dates = append(m.book.Dates, d)
			m.book.Values = append(m.book.Values, nil)
		}
	}
}

// add appends a series with its returns.
func (m *maker) add(s Series, returns []float64) int {
	for t := range m.book.Values {
		u, _ := s.print(returns[t]) // an invented return is far within the bounds
		m.book.Values[t] = append(m.book.Values[t], u)
	}
	m.book.Series = append(m.book.Series, s)
	return len(m.book.Series) - 1
}

// helpers are the benchmarks of the first half of the groups, and the currency.
func (m *maker) helpers() {
	helper := Series{Feed: BenchFeed, Reference: -1, FX: -1, Helper: true, Tick: percentPoint / 10_000}
	for g := range len(m.Factors) / 2 {
		helper.ID = groupName(g) + "-index"
		m.add(helper, m.Factors[g])
	}
	if m.FX {
		helper.ID = currency
		m.add(helper, m.clustered(m.Days, fxDev, 0.05, 0.90))
	}
}

func groupName(g int) string {
	if g < len(GroupNames) {
		return GroupNames[g]
	}
	return fmt.Sprintf("group-%d", g+1)
}

func (m *maker) funds() {
	for g, factor := range m.Factors {
		for n := range groupSize {
			s := Series{ID: fmt.Sprintf("%s-%02d", groupName(g), n+1), Group: groupName(g), Feed: FundsFeed, Reference: -1, FX: -1,
				Peers: g >= len(m.Factors)/2, Beta: 0.6 + 0.7*m.random.Float64(), Residual: 0.0015, Tick: percentPoint / 100}
			if !s.Peers {
				s.Reference = g
			}
			if n%2 == 1 {
				s.Tick = percentPoint / 10_000
			}
			if n/2%2 == 1 {
				s.Residual = 0.003
			}
			if m.FX && n%2 == 1 {
				s.FX = len(m.Factors) / 2
			}
			r := m.clustered(m.Days, s.Residual, 0.05, 0.90)
			for t := range r {
				r[t] += float64(s.Beta * factor[t])
			}
			m.add(s, r)
		}
	}
}

// events lists the distributions of the calendar.
func (m *maker) events() {
	for i := range m.book.Series {
		if m.book.Series[i].Helper {
			continue
		}
		for t := 10 + m.random.IntN(60); t < m.Days; t += 60 + m.random.IntN(6) {
			amount := float64(20+m.random.IntN(80)) / 1e4
			m.book.Events = append(m.book.Events, rules.Event{Date: m.book.Dates[t], Series: m.book.Series[i].ID, Kind: distribution, Amount: amount})
		}
	}
}

const (
	distribution = "distribution"
	split        = "split"
)

// clustered are GARCH(1,1) returns with a deviation in the long run:
//
//	v' = (1-a-b) dev^2 + a r^2 + b v
func (m *maker) clustered(n int, dev, a, b float64) []float64 {
	out := make([]float64, n)
	long := dev * dev
	v := long
	for range 100 { // let the start be forgotten
		v = m.next(v, long, a, b, nil)
	}
	for t := range out {
		v = m.next(v, long, a, b, &out[t])
	}
	return out
}

func (m *maker) next(v, long, a, b float64, into *float64) float64 {
	r := math.Sqrt(v) * m.t5()
	if into != nil {
		*into = r
	}
	return float64((1-a-b)*long) + float64(a*r*r) + float64(b*v)
}

// t5 is a draw of Student's t with 5 degrees of freedom scaled to unit variance.
func (m *maker) t5() float64 {
	chi := 0.0
	for range 5 {
		x := m.random.NormFloat64()
		chi += float64(x * x)
	}
	return m.random.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5)
}
