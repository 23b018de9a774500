package causes

import (
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"strayd/rules"
)

// anything draws values of every size, missing ones, zeros, and what is known of them.
func anything(random *rand.Rand, n int, last []rules.Units) Day {
	var d Day
	for i := range n {
		u := rules.Units(random.NormFloat64() * 1e13)
		switch random.IntN(12) {
		case 0:
			u = 0
		case 1:
			u = rules.Missing
		case 2:
			u = rules.Units(random.Int64()) // up to 9,223
		case 3:
			u = -rules.Units(random.Int64())
		case 4:
			u = -rules.One
		case 5:
			u = last[i]
		case 6:
			u = rules.Units(random.IntN(3) - 1)
		case 7:
			u = u / 1e12 * 1e12
		}
		d.Values = append(d.Values, u)
	}
	if random.IntN(3) == 0 {
		d.Known = []Known{}
		for i := range n {
			if random.IntN(4) == 0 {
				d.Known = append(d.Known, Known{Member: i, Use: Use(random.IntN(4)), Value: rules.Units(random.Int64())})
			}
		}
	}
	if random.IntN(3) == 0 {
		d.Fresh = make([]bool, n)
		for i := range d.Fresh {
			d.Fresh[i] = random.IntN(2) == 0
		}
	}
	return d
}

// Whatever the values are, a pool says nothing that is not a number, lists what it says by member, and changes nothing that it is given.
func TestAnyValues(t *testing.T) {
	for seed := range uint64(20) {
		random := rand.New(rand.NewPCG(seed, 9))
		members := clonePool(12).members
		for i := range members {
			members[i].FX = random.IntN(3)*6 - 1 - 5*(i%2) // some
			if members[i].FX < -1 || members[i].FX == i || members[i].FX >= len(members) {
				members[i].FX = -1
			}
			members[i].Events = []rules.Event{{Date: 19_100, Kind: "distribution", Amount: random.Float64()}, {Date: 19_050, Kind: "split", Amount: 3}}
		}
		given := slices.Clone(members)
		p := NewPool(members, []string{"g"}, 0.002)
		last := make([]rules.Units, len(members))
		for n := range 150 {
			d := anything(random, len(members), last)
			d.Date = rules.Date(19_000 + n/5*7 + n%5)
			before := slices.Clone(d.Values)
			r := p.Step(d)
			finite(t, "anything", r)
			if !slices.IsSortedFunc(r.Views, func(a, b View) int { return a.Member - b.Member }) {
				t.Fatalf("seed %d: views are not by member", seed)
			}
			if !slices.Equal(before, d.Values) || !reflect.DeepEqual(given, members) {
				t.Fatalf("seed %d: what was given is changed", seed)
			}
			last = d.Values
		}
	}
}
