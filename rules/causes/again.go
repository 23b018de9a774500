package causes

import (
	"math"

	"strayd/rules"
)

// again weighs yesterday's value sent again, and a zero for a missing value.
func (p *Pool) again(w *weighing, lk *look) {
	switch {
	case lk.u == 0:
		p.add(w, rules.CauseZero, priorZero, 1, rules.Num{})
	case lk.mark&markRepeat != 0:
		p.add(w, rules.CauseRepeat, priorRepeat, 1, rules.Num{})
	}
}

// leastRuns is how many runs show that zeros or repeats are a series' nature. One run of a stale price does not.
const leastRuns = 3

// natural is the probability of one more coincidence beyond what the tick brings about: that a run goes on, or that one begins. What
// chance may bring about is taken off with two deviations of its count. Two draws of a t5 fall into one cell with probability 0.32
// tick/deviation, a draw into the cell of zero with 0.49 tick/deviation.
func natural(c coincidence, again bool, of int, chance float64) float64 {
	if c.runs < leastRuns {
		return 0
	}
	begins := beyond(c.runs, of, chance)
	if !again {
		return begins
	}
	return max(begins, beyond(c.days-c.runs, c.days, chance))
}

// beyond is the share of days with a coincidence, beyond chance.
func beyond(count, of int, chance float64) float64 {
	expected := float64(of) * min(chance, 1)
	return max(0, float64(count)-expected-2*math.Sqrt(expected+1)) / float64(of)
}
