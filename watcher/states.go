package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
	"strayd/stats"
)

// stateTurns is how many passes it takes until every block's state has been stored anew, in a ledger of more blocks than that.
const stateTurns = 8

// keepStates notes the rolling state of every lane after the task's last date: always when older dates were replayed, or when the
// ledger is small; else when it is the block's turn, so that a day of a large ledger writes an eighth of the states.
func (w *worker) keepStates(t task, out *outcome) {
	if !w.j.turn(t.block) && !w.replayed {
		return
	}
	for _, l := range w.lanes {
		out.states = append(out.states, l.state(t, w.upto))
	}
}

func (j *judging) turn(block uint32) bool {
	return j.names.Len() <= stateTurns*BlockSize || (j.step+block)%stateTurns == 0
}

// partState is the part of a block's state that one task covers.
type partState struct {
	from int
	State
}

// state is a lane's state for a task's series.
func (l *lane) state(t task, upto rules.Date) partState {
	n := t.width
	s := State{Range: l.id, Block: t.block, Upto: upto, N: make([]uint32, 0, n), Last: make([]rules.Date, 0, n), Sum: make([]Int128, 0, n),
		Sq: make([]Int128, 0, n)}
	for i := range t.width {
		s.N = append(s.N, uint32(l.windows.N(i)))
		s.Last = append(s.Last, l.last[i])
		var sum stats.Int128
		var sq stats.Uint128
		switch w := l.windows.(type) {
		case *stats.WeightedPanel:
			sq = w.State(i).Q
			s.Var = append(s.Var, w.State(i).V)
		case *stats.Panel:
			sums := w.Sums(i)
			sum, sq = sums.S, sums.Q
		case *stats.SortedPanel:
			var sums stats.Sums
			for _, k := range w.Sorted(i) {
				sums.Add(k)
			}
			sum, sq = sums.S, sums.Q
		}
		s.Sum = append(s.Sum, Int128{uint64(sum.Hi), sum.Lo})
		s.Sq = append(s.Sq, Int128{sq.Hi, sq.Lo})
	}
	return partState{t.from, s}
}

// joinStates puts the parts of each block together, in order.
func joinStates(parts []partState) []State {
	slices.SortStableFunc(parts, func(a, b partState) int {
		return cmp.Or(cmp.Compare(a.Range, b.Range), cmp.Compare(a.Block, b.Block), cmp.Compare(a.from, b.from))
	})
	var out []State
	for _, p := range parts {
		if p.from == 0 {
			out = append(out, p.State)
			continue
		}
		s := &out[len(out)-1]
		s.N, s.Last = append(s.N, p.N...), append(s.Last, p.Last...)
		s.Sum, s.Sq, s.Var = append(s.Sum, p.Sum...), append(s.Sq, p.Sq...), append(s.Var, p.Var...)
	}
	return out
}
