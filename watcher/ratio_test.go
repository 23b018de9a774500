package watcher_test

import (
	"math"
	"math/big"
	"testing"

	"strayd/watcher"
)

// The exact ratio less one, rounded once, half to even, against rationals; ties need a price that 1e15 does not divide out of.
func TestRatio(t *testing.T) {
	for _, c := range [][2]int64{
		{1, 1}, {2, 1}, {1, 2}, {1, 3}, {2, 3}, {10001, 10000}, {math.MaxInt64, math.MaxInt64}, {math.MaxInt64, math.MaxInt64 - 1},
		{1, math.MaxInt64}, {math.MaxInt64, 1e15}, {math.MaxInt64, 1}, {9224e10, 1e10}, {9225e10, 1e10},
		{2e15 + 1, 2e15}, {2e15 + 3, 2e15}, {2e15 + 5, 2e15}, {2e15 - 1, 2e15}, {2e15 - 3, 2e15}, {2e15 - 5, 2e15},
	} {
		want := new(big.Rat).Mul(new(big.Rat).SetFrac64(c[0]-c[1], c[1]), big.NewRat(1e15, 1))
		q, m := new(big.Int).DivMod(want.Num(), want.Denom(), new(big.Int))
		if c := m.Lsh(m, 1).Cmp(want.Denom()); c > 0 || c == 0 && q.Bit(0) == 1 {
			q.Add(q, big.NewInt(1))
		}
		got, ok := watcher.Ratio(c[0], c[1])
		if ok != q.IsInt64() || ok && got != q.Int64() {
			t.Errorf("Ratio(%d, %d) is %d, %v, want %s", c[0], c[1], got, ok, q)
		}
	}
}
