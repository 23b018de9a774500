package causes

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"strayd/rules"
)

// crowd is a pool of groups of fifteen, every other one with a benchmark, and its values over days.
func crowd(groups, days int) ([]Member, []string, []Day) {
	random := rand.New(rand.NewPCG(1, 2))
	var members []Member
	var names []string
	for g := range groups {
		names = append(names, fmt.Sprint("group", g))
		if g%2 == 0 {
			members = append(members, Member{ID: fmt.Sprint("index", g), Group: -1, FX: -1})
		}
		for i := range 15 {
			m := Member{ID: fmt.Sprint("fund", g, i), Group: g, FX: -1, Reference: Reference{Kind: Peers}}
			if g%2 == 0 {
				m.Reference = Reference{Kind: Series, Series: len(members) - 1 - i}
			}
			members = append(members, m)
		}
	}
	list := make([]Day, days)
	date, _ := rules.DateOf(2020, 1, 6)
	for n := range list {
		list[n].Date = date + rules.Date(n/5*7+n%5)
		for g := range groups {
			factor := random.NormFloat64() * 0.01
			if g%2 == 0 {
				list[n].Values = append(list[n].Values, printed(factor, 6))
			}
			for range 15 {
				list[n].Values = append(list[n].Values, printed(factor+random.NormFloat64()*0.002, 6))
			}
		}
	}
	return members, names, list
}

// What a value costs, all that is done on its date shared out, while the windows fill and once they are full.
func BenchmarkStep(b *testing.B) {
	members, names, days := crowd(40, 900)
	for b.Loop() {
		p := NewPool(members, names, 0.002)
		for _, d := range days {
			p.Step(d)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N*len(members)*len(days)), "ns/value")
}
