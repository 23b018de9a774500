package causes

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"strayd/rules"
)

// quietBook is a kind of series without errors.
type quietBook struct {
	name    string
	groups  int // of twelve members each, with peers; 0 for thirty members alone
	places  int // decimals of a fraction
	returns func(random *rand.Rand, days int) []float64
}

// student is a draw of Student's t with df degrees of freedom, scaled to unit variance.
func student(random *rand.Rand, df int) float64 {
	chi := 0.0
	for range df {
		x := random.NormFloat64()
		chi += x * x
	}
	return random.NormFloat64() / math.Sqrt(chi/float64(df)) * math.Sqrt(float64(df-2)/float64(df))
}

func draws(deviation, mean float64, df int) func(*rand.Rand, int) []float64 {
	return func(random *rand.Rand, days int) []float64 {
		out := make([]float64, days)
		for t := range out {
			out[t] = mean + deviation*student(random, df)
		}
		return out
	}
}

// garch is GARCH(1,1) with alpha 0.1, beta 0.88 and t shocks (Bollerslev 1987, Review of Economics and Statistics 69:542-547).
func garch(deviation float64, df int) func(*rand.Rand, int) []float64 {
	return func(random *rand.Rand, days int) []float64 {
		out := make([]float64, days)
		v := deviation * deviation
		for t := range out {
			out[t] = math.Sqrt(v) * student(random, df)
			v = 0.02*deviation*deviation + 0.1*out[t]*out[t] + 0.88*v
		}
		return out
	}
}

// gappy has a zero on every tenth day and the value before on every eighth, by nature.
func gappy(random *rand.Rand, days int) []float64 {
	out := draws(0.004, 0, 5)(random, days)
	for t := 1; t < days; t++ {
		switch random.IntN(40) {
		case 0, 1, 2, 3:
			out[t] = 0
		case 4, 5, 6, 7, 8:
			out[t] = out[t-1]
		}
	}
	return out
}

var quietBooks = []quietBook{
	{"stocks, two decimals", 0, 4, garch(0.02, 4)},
	{"stocks, four decimals", 0, 6, garch(0.02, 3)},
	{"stocks with peers that explain nothing", 3, 6, garch(0.02, 3)},
	{"funds with peers", 3, 6, garch(0.002, 5)},
	{"funds with peers, two decimals", 3, 4, garch(0.002, 5)},
	{"money market, four decimals", 0, 6, draws(0.00001, 0.00008, 5)},
	{"money market with peers", 3, 6, draws(0.00001, 0.00008, 5)},
	{"natural zeros and repeats", 0, 6, gappy},
	{"bonds, two decimals", 0, 4, draws(0.002, 0.0001, 5)},
}

// fill makes the members and days of a book. Funds with peers follow a factor of deviation 1 %.
func (q *quietBook) fill(seed uint64, days int) ([]Member, []string, []Day) {
	random := rand.New(rand.NewPCG(seed, 77))
	list := make([]Day, days)
	date, _ := rules.DateOf(2020, 1, 6)
	for t := range list {
		list[t].Date = date + rules.Date(t/5*7+t%5)
	}
	var members []Member
	var names []string
	for g := range max(q.groups, 1) {
		factor := draws(0.01, 0, 5)(random, days)
		if q.groups > 0 {
			names = append(names, fmt.Sprint("group", g))
		}
		for i := range 12 + 18*boolInt(q.groups == 0) {
			m := Member{ID: fmt.Sprint(g, "-", i), Group: -1, FX: -1}
			beta := 0.0
			if q.groups > 0 {
				m.Group, m.Reference.Kind = g, Peers
				if q.name[:5] == "funds" {
					beta = 0.8 + 0.4*random.Float64()
				}
			}
			members = append(members, m)
			for t, r := range q.returns(random, days) {
				list[t].Values = append(list[t].Values, nearest(r+beta*factor[t], q.places))
			}
		}
	}
	return members, names, list
}

func boolInt(b bool) int {
	if b {
		return 1
	}
	return 0
}

func nearest(r float64, places int) rules.Units {
	tick := math.Pow10(rules.Places - places)
	return rules.Units(math.Round(r*1e15/tick)) * rules.Units(tick)
}

// What is flagged doubtful, stale or repeat on books without an error, and is not beyond a breach line, stays below 1.5 times the configured
// share, with three deviations of a Poisson count on top.
func TestQuietBooks(t *testing.T) {
	const share = 0.002
	for _, q := range quietBooks {
		flags, values := 0, 0
		looks := map[rules.Cause]int{}
		for seed := range uint64(2) {
			members, names, days := q.fill(seed, 600)
			p := NewPool(members, names, share)
			for n, d := range days {
				r := p.Step(d)
				finite(t, q.name, r)
				if n < 150 {
					continue
				}
				values += len(members)
				for _, v := range r.Views {
					if v.Kind != "" && math.Abs(v.Z) < breachZ && math.Abs(v.OwnZ) < breachZ {
						flags++
						looks[v.LooksLike]++
					}
				}
			}
		}
		limit := 1.5*share*float64(values) + 3*math.Sqrt(1.5*share*float64(values))
		t.Logf("%s: %d flags in %d values, %.2f times the share, %v", q.name, flags, values, float64(flags)/(share*float64(values)), looks)
		if float64(flags) > limit {
			t.Errorf("%s: %d flags in %d values, at most %.0f", q.name, flags, values, limit)
		}
	}
}

// After volatility doubles for good, of factor and residual, doubts are back within twice their share between the 60th day and the 250th.
func TestAfterVolatilityDoubles(t *testing.T) {
	const share, turn, days = 0.002, 400, 650
	flags, values := 0, 0
	for seed := range uint64(4) {
		members, names, list := quietBooks[3].fill(seed, days)
		for n := turn; n < days; n++ {
			for i, u := range list[n].Values {
				list[n].Values[i] = nearest(2*u.Float(), 6)
			}
		}
		p := NewPool(members, names, share)
		for n, d := range list {
			r := p.Step(d)
			if n < turn+60 {
				continue
			}
			values += len(members)
			for _, v := range r.Views {
				if v.Kind != "" {
					flags++
				}
			}
		}
	}
	if limit := 2 * share * float64(values); float64(flags) > limit+3*math.Sqrt(limit) {
		t.Errorf("%d flags in %d values, at most %.0f", flags, values, limit)
	}
}

// finite says where a figure is not a number.
func finite(t *testing.T, name string, r *Result) {
	t.Helper()
	ok := func(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }
	for _, list := range [][]View{r.Views, r.Earlier} {
		for _, v := range list {
			good := ok(v.Share) && ok(v.LogOdds) && ok(v.Line) && ok(v.Implied.V) && ok(v.ReferenceReturn.V) && ok(v.Residual.V) &&
				ok(v.Deviation.V) && ok(v.Z) && ok(v.OwnZ)
			sum := 0.0
			for _, c := range v.Causes {
				good = good && ok(c.Share) && ok(c.Implied.V)
				sum += c.Share
			}
			if !good || sum > 1+1e-9 {
				t.Fatalf("%s: %+v", name, v)
			}
		}
	}
}
