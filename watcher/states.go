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

// state is a lane's state for a task's series. A series whose newest used value is too old by then starts anew with its next value,
// so that it has none.
func (l *lane) state(t task, upto rules.Date) partState {
	n := t.width
	s := State{Range: l.id, Block: t.block, Upto: upto, N: make([]uint32, n), Last: make([]rules.Date, n), Sum: make([]Int128, n), Sq: make([]Int128, n)}
	weighted, ok := l.windows.(*stats.WeightedPanel)
	if ok {
		s.Var = make([]float64, n)
	}
	edge := upto - dormantDays
	for i := range n {
		if s.Last[i] = l.last[i]; s.Last[i] < edge && (s.Last[i] == rules.NoDate || l.between(i, s.Last[i], upto) > rules.DormantAfter) {
			s.Last[i] = rules.NoDate
			continue
		}
		s.N[i] = uint32(l.windows.N(i))
		sum, sq := l.sums(i)
		s.Sum[i], s.Sq[i] = Int128{uint64(sum.Hi), sum.Lo}, Int128{sq.Hi, sq.Lo}
		if ok {
			s.Var[i] = weighted.State(i).V
		}
	}
	return partState{t.from, s}
}

// sums are the exact sums of one series' window; of a weighted one the squares behind its seed.
func (l *lane) sums(i int) (sum stats.Int128, sq stats.Uint128) {
	switch w := l.windows.(type) {
	case *stats.WeightedPanel:
		sq = w.State(i).Q
	case *stats.Panel:
		sums := w.Sums(i)
		sum, sq = sums.S, sums.Q
	case *stats.Slide:
		sums := w.Sums(i)
		sum, sq = sums.S, sums.Q
	case *stats.SortedPanel:
		var sums stats.Sums
		for _, k := range w.Sorted(i) {
			sums.Add(k)
		}
		sum, sq = sums.S, sums.Q
	}
	return sum, sq
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
