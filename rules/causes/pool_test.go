package causes

import (
	"fmt"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"strayd/rules"
)

// noisy makes a pool of two groups of ten, a benchmark and a currency, with values over days: factors, residuals, and slips here and there.
func noisy(seed uint64, days int) ([]Member, []Day) {
	random := rand.New(rand.NewPCG(seed, 1))
	members := []Member{{ID: "index", Group: -1, FX: -1}, {ID: "currency", Group: -1, FX: -1}}
	for i := range 20 {
		m := Member{ID: string(rune('a' + i)), Group: i / 10, FX: -1, Reference: Reference{Kind: Series}}
		if i >= 10 {
			m.Reference.Kind = Peers
		}
		if i%3 == 0 {
			m.FX = 1
		}
		members = append(members, m)
	}
	var list []Day
	date, _ := rules.DateOf(2020, 1, 6)
	for n := range days {
		d := Day{Date: date + rules.Date(n/5*7+n%5)}
		factor := [2]float64{random.NormFloat64() * 0.01, random.NormFloat64() * 0.01}
		d.Values = append(d.Values, round(factor[0]), round(random.NormFloat64()*0.005))
		for i := range 20 {
			r := factor[i/10]*(0.7+0.05*float64(i%10)) + random.NormFloat64()*0.002
			d.Values = append(d.Values, slip(random, round(r), list, i+2))
		}
		list = append(list, d)
	}
	return members, list
}

func round(r float64) rules.Units { return rules.Units(r*1e6) * 1e9 }

func slip(random *rand.Rand, u rules.Units, before []Day, i int) rules.Units {
	if len(before) == 0 {
		return u
	}
	switch random.IntN(400) {
	case 0:
		return u * 100
	case 1:
		return -u
	case 2:
		return 0
	case 3:
		return before[len(before)-1].Values[i]
	case 4:
		return rules.Missing
	case 5:
		return u - 8e12
	}
	return u
}

// outOf lists what a result concluded of its date, as a caller would hand it back.
func outOf(r *Result) []Known {
	known := []Known{}
	for _, v := range r.Views {
		if v.Out {
			known = append(known, Known{Member: v.Member, Use: Out})
		}
	}
	for _, w := range r.Wrong {
		known = append(known, Known{Member: w.Member, Use: Out})
	}
	return known
}

// A pool that is made anew and led through the last Memory dates, with what was concluded of them, says the same as one that saw all, and
// goes on to say the same, down to the last bit of what it holds values against.
func TestPoolDependsOnItsMemory(t *testing.T) {
	const after = 60
	for seed := range uint64(3) {
		members, days := noisy(seed, Memory+after+100)
		groups := []string{"one", "two"}
		whole := NewPool(members, groups, 0.002)
		known := make([][]Known, len(days))
		var want []*Result
		var looks [][]look
		for n, d := range days {
			r := whole.Step(d)
			want, looks = append(want, r), append(looks, slices.Clone(whole.looks))
			known[n] = outOf(r)
			for _, v := range r.Earlier {
				known[n-1] = append(known[n-1], Known{Member: v.Member, Use: Out})
			}
		}
		for _, start := range []int{Memory, Memory + 57, Memory + 99} {
			anew := NewPool(members, groups, 0.002)
			for n := start - Memory; n < start+after; n++ {
				d := days[n]
				if n < start-1 {
					d.Known = known[n]
				} else if n == start-1 {
					d.Known = outOf(want[n]) // what the day itself concluded
				}
				got := anew.Step(d)
				if n < start {
					continue
				}
				if !reflect.DeepEqual(got, want[n]) {
					t.Fatalf("seed %d, from %d, date %d: made anew %+v, want %+v", seed, start, n, got, want[n])
				}
				if !same(anew.looks, looks[n]) {
					t.Fatalf("seed %d, from %d, date %d: values are held against other figures", seed, start, n)
				}
			}
		}
	}
}

// same compares all that values are held against; a figure that is not there equals itself.
func same(a, b []look) bool {
	return fmt.Sprintf("%v", a) == fmt.Sprintf("%v", b)
}

// The same dates give the same results.
func TestPoolIsDeterministic(t *testing.T) {
	members, days := noisy(9, 300)
	a, b := NewPool(members, []string{"one", "two"}, 0.002), NewPool(members, []string{"one", "two"}, 0.002)
	views := 0
	for _, d := range days {
		x, y := a.Step(d), b.Step(d)
		if !reflect.DeepEqual(x, y) {
			t.Fatalf("%s: %+v and %+v", d.Date, x, y)
		}
		views += len(x.Views)
	}
	if views == 0 {
		t.Error("no views in 300 days with slips")
	}
}
