package stats_test

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/stats"
)

// returns are a column of typical daily returns at 1e-15 a unit: a deviation of 1 %.
func returns(r *rand.Rand, n int) []int64 {
	col := make([]int64, n)
	for i := range col {
		col[i] = int64(r.NormFloat64() * 1e13)
	}
	return col
}

func BenchmarkPanel(b *testing.B) {
	for _, size := range []struct{ series, window int }{{1000, 60}, {4080, 60}, {4080, 250}} {
		r := rand.New(rand.NewPCG(1, 2))
		p := stats.NewPanel(size.series, size.window)
		var cols, gapped [][]int64
		for range 64 {
			cols = append(cols, returns(r, size.series))
		}
		for i := range size.window {
			p.Push(cols[i%len(cols)])
		}
		gate := stats.PlainGate(size.window, 20, stats.Fixed(3), true)
		name := fmt.Sprintf("%dx%d", size.series, size.window)
		perValue := func(b *testing.B) {
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(size.series), "ns/value")
		}
		b.Run("Scan/"+name, func(b *testing.B) {
			var cand []int32
			for i := 0; b.Loop(); i++ {
				cand = p.Scan(cols[i%len(cols)], gate, cand[:0])
			}
			perValue(b)
		})
		b.Run("Push/"+name, func(b *testing.B) {
			for i := 0; b.Loop(); i++ {
				p.Push(cols[i%len(cols)])
			}
			perValue(b)
		})
		b.Run("Push with gaps/"+name, func(b *testing.B) { // 1 in 50 is absent, so that the series drift apart
			gaps := stats.NewPanel(size.series, size.window)
			for _, col := range cols {
				col = slices.Clone(col)
				for j := range col {
					if r.IntN(50) == 0 {
						col[j] = stats.Missing
					}
				}
				gapped = append(gapped, col)
			}
			for i := range 20 * size.window {
				gaps.Push(gapped[i%len(gapped)])
			}
			for i := 0; b.Loop(); i++ {
				gaps.Push(gapped[i%len(gapped)])
			}
			perValue(b)
		})
		b.Run("Prepend/"+name, func(b *testing.B) {
			for i := 0; b.Loop(); i++ {
				if p.Full(0) {
					b.StopTimer()
					p.Reset()
					b.StartTimer()
				}
				p.Prepend(cols[i%len(cols)])
			}
			perValue(b)
		})
	}
}
