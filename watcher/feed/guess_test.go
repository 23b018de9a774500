package feed

import (
	"bytes"
	"context"
	"fmt"
	"math/rand/v2"
	"testing"

	"strayd/watcher"
)

// manyHeld is a dictionary as a ledger gives it: no table of its names is made until one is looked for.
func manyHeld(n int) *watcher.Names {
	var text []byte
	var ends []uint32
	for s := range n {
		text = fmt.Appendf(text, "S%06d", s)
		ends = append(ends, uint32(len(text)))
	}
	return watcher.NewNames(text, ends)
}

// Files of very many held series: whatever is left out, swapped or new, and wherever the chunks end, every value comes to the series
// whose name stands beside it. The value of series n on line m is n x 1e-8, so that a wrong guess shows.
func TestManyHeldSeries(t *testing.T) {
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	rng := rand.New(rand.NewPCG(seed, 3))
	const held = 3 * recentNames
	for _, odd := range []int{0, 1000, 20, 2} { // one row in so many is out of the ordinary
		var text bytes.Buffer
		text.WriteString("date,series,return\n")
		rows := map[int]bool{}
		add := func(n int) {
			if !rows[n] {
				rows[n] = true
				fmt.Fprintf(&text, "2024-01-02,S%06d,0.%08d\n", n, n)
			}
		}
		for n := range held {
			if odd == 0 || rng.IntN(odd) > 0 {
				add(n)
				continue
			}
			switch rng.IntN(4) {
			case 0: // left out
			case 1:
				add(held + rng.IntN(1000)) // new
			case 2:
				add(min(n+1+rng.IntN(300), held-1))
				add(n)
			case 3:
				add(rng.IntN(held))
			}
		}
		for _, chunk := range []int{1 << 10, 1 << 14, 1 << 19} {
			c := lay(t, "day.csv", text.Bytes())
			sheet, err := Read(context.Background(), c, longFeed(), manyHeld(held), Options{Now: testNow, Workers: 3, chunk: chunk})
			if err != nil {
				t.Fatal(err)
			}
			if sheet.Rows != len(rows) {
				t.Fatalf("%d rows, want %d", sheet.Rows, len(rows))
			}
			for _, col := range sheet.Columns {
				vals := make([]int64, col.Len())
				col.Fill(vals, 0, watcher.Returns.Places())
				for i, v := range vals {
					name := string(sheet.Names.Name(col.Block*watcher.BlockSize + uint32(i)))
					if v != watcher.Missing64 && name != fmt.Sprintf("S%06d", v/1e7) {
						t.Fatalf("series %s holds %d", name, v)
					}
				}
			}
		}
	}
}
