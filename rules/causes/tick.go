package causes

import "strayd/rules"

// none stands for the decimals of a value that is not there.
const none = 255

// decimals is how many decimals of a fraction a return is written with, 0 to 15.
func decimals(u rules.Units) uint8 {
	if u == 0 {
		return 0
	}
	d := uint8(rules.Places)
	if u%1e8 == 0 {
		u, d = u/1e8, d-8
	}
	for d > 0 && u%10 == 0 {
		u, d = u/10, d-1
	}
	return d
}

// grid learns from the last dates how many decimals a series is written with.
type grid struct {
	ring  [slots]uint8
	count [rules.Places + 1]int
	n     int
}

func newGrid() grid {
	var g grid
	for i := range g.ring {
		g.ring[i] = none
	}
	return g
}

func (g *grid) expire(t int) {
	if d := g.ring[(t-guard-1)&mask]; d != none {
		g.count[d]--
		g.n--
	}
	g.ring[t&mask] = none
}

func (g *grid) take(t int, d uint8) {
	g.ring[t&mask] = d
	g.count[d]++
	g.n++
}

// places is the fewest decimals that 19 in 20 of the values are written with, and the share of those that have more.
func (g *grid) places() (d int, finer float64) {
	need, have := g.n-g.n/20, 0
	for d = range g.count {
		if have += g.count[d]; have >= need {
			break
		}
	}
	return d, (float64(g.n-have) + 0.5) / float64(g.n+1)
}

var tenth = func() (p [rules.Places + 5]float64) {
	p[0] = 1
	for i := 1; i < len(p); i++ {
		p[i] = 1 / float64(rules.Pow10(i))
	}
	return p
}()
