package stats_test

import (
	"fmt"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/stats"
)

// trial drives a Panel and a SortedPanel beside plain lists.
type trial struct {
	t      *testing.T
	r      *rand.Rand
	models []model
	panel  *stats.Panel
	sorted *stats.SortedPanel
}

func newTrial(t *testing.T, seed uint64, series, window int) *trial {
	b := &trial{t, rand.New(rand.NewPCG(seed, 11)), make([]model, series), stats.NewPanel(series, window), stats.NewSortedPanel(series, window)}
	for i := range b.models {
		b.models[i].window = window
	}
	return b
}

// unchanged runs f and fails when it changed vals.
func (b *trial) unchanged(vals []int64, f func()) {
	before := slices.Clone(vals)
	f()
	if !slices.Equal(vals, before) {
		b.t.Fatal("an input was changed")
	}
}

func (b *trial) present(vals []int64, f func(m *model, k int64)) {
	for i, k := range vals {
		if k != stats.Missing {
			f(&b.models[i], k)
		}
	}
}

func (b *trial) push() {
	vals := column(b.r, len(b.models))
	b.unchanged(vals, func() { b.panel.Push(vals); b.sorted.Push(vals) })
	b.present(vals, (*model).push)
}

func (b *trial) prepend() {
	vals := column(b.r, len(b.models))
	b.unchanged(vals, func() { b.panel.Prepend(vals); b.sorted.Prepend(vals) })
	b.present(vals, (*model).prepend)
}

// load replaces one window, as a replay after a decision does: one value of it left out, another changed.
func (b *trial) load() {
	i := b.r.IntN(len(b.models))
	vals := slices.Clone(b.models[i].values)
	for range b.r.IntN(3) {
		if n := len(vals); n > 0 {
			vals[b.r.IntN(n)] = regimes[b.r.IntN(len(regimes))](b.r)
			vals[b.r.IntN(n)] = stats.Missing
		}
	}
	b.unchanged(vals, func() { b.panel.Load(i, vals); b.sorted.Load(i, vals) })
	b.models[i].values = nil
	for _, k := range vals {
		if k != stats.Missing {
			b.models[i].push(k)
		}
	}
}

func (b *trial) clear() {
	i := b.r.IntN(len(b.models))
	b.panel.Clear(i)
	b.sorted.Clear(i)
	b.models[i].values = nil
}

func (b *trial) reset() {
	b.panel.Reset()
	b.sorted.Reset()
	for i := range b.models {
		b.models[i].values = nil
	}
}

func (b *trial) step() {
	switch n := b.r.IntN(100); {
	case n < 60:
		b.push()
	case n < 85:
		b.prepend()
	case n < 95:
		b.load()
	case n < 99:
		b.clear()
	default:
		b.reset()
	}
}

// check compares every window with its list: the same values, and sums equal bit for bit to those recomputed from nothing.
func (b *trial) check() {
	b.t.Helper()
	for i, m := range b.models {
		full := len(m.values) == m.window
		if b.panel.N(i) != len(m.values) || b.sorted.N(i) != len(m.values) || b.panel.Full(i) != full || b.sorted.Full(i) != full {
			b.t.Fatalf("series %d: %d and %d values, want %d", i, b.panel.N(i), b.sorted.N(i), len(m.values))
		}
		if got := b.panel.Values(i, nil); !slices.Equal(got, m.values) {
			b.t.Fatalf("series %d: window %v, want %v", i, got, m.values)
		}
		if got := b.sorted.Values(i, nil); !slices.Equal(got, m.values) {
			b.t.Fatalf("series %d: sorted panel's window %v, want %v", i, got, m.values)
		}
		if got := b.panel.Sums(i); got != m.sums() {
			b.t.Fatalf("series %d: sums %v, recomputed %v", i, got, m.sums())
		}
		if got := b.sorted.Sorted(i); !slices.Equal(got, slices.Sorted(slices.Values(m.values))) {
			b.t.Fatalf("series %d: %v is not %v sorted", i, got, m.values)
		}
	}
}

// scan holds a scan against exact arithmetic: it names every value that is outside, cannot be judged or is beyond MaxValue, and
// none that is inside by a millionth, unless the spread is a mere unit.
func (b *trial) scan() {
	b.t.Helper()
	const least = 3
	z := []float64{0.5, 1.96, 3, 4.27}[b.r.IntN(4)]
	predictive := b.r.IntN(2) == 0
	window := b.models[0].window
	vals := make([]int64, len(b.models))
	for i, m := range b.models {
		vals[i] = probe(b.r, m.values, z)
	}
	var plain, mad []int32
	b.unchanged(vals, func() {
		plain = b.panel.Scan(vals, stats.PlainGate(window, least, stats.Fixed(z), predictive), []int32{-7})
		mad = b.sorted.Scan(vals, stats.MADGate(window, least, stats.Fixed(z)), []int32{-7})
	})
	if !slices.IsSorted(plain) || plain[0] != -7 || mad[0] != -7 {
		b.t.Fatalf("a scan appends in order: %v, %v", plain, mad)
	}
	for i, k := range vals {
		m := b.models[i].values
		out := len(m) < least || k > stats.MaxValue || k < -stats.MaxValue
		b.verdict("plain", i, k, slices.Contains(plain, int32(i)), out, plainShare(m, k, z, predictive), exactly(m).spreadInteger.IsInt64())
		b.verdict("mad", i, k, slices.Contains(mad, int32(i)), out, madShare(m, k, z), false)
	}
}

func (b *trial) verdict(scale string, i int, k int64, named, out bool, share *big.Rat, tiny bool) {
	b.t.Helper()
	switch {
	case k == stats.Missing:
		if named {
			b.t.Fatalf("%s, series %d: an absent value is named", scale, i)
		}
	case out || share == nil || share.Cmp(ratio(1, 1)) > 0:
		if !named {
			b.t.Fatalf("%s, series %d: %d is omitted; window %v, share %v", scale, i, k, b.models[i].values, share)
		}
	case share.Cmp(ratio(999_999, 1_000_000)) < 0 && !tiny:
		if named {
			b.t.Fatalf("%s, series %d: %d is inside but named; window %v", scale, i, k, b.models[i].values)
		}
	}
}

// TestPanelsAgainstLists: whatever comes in and goes out, the state is that of a plain list, and a scan omits nothing.
func TestPanelsAgainstLists(t *testing.T) {
	for seed, window := range []int{1, 2, 3, 7, 20, 60, 61, 250} {
		t.Run(fmt.Sprintf("seed %d, window %d", seed, window), func(t *testing.T) {
			b := newTrial(t, uint64(seed), 3*len(regimes), window)
			for range 120 {
				for range 1 + b.r.IntN(max(1, window/4)) {
					b.step()
				}
				b.check()
				b.scan()
			}
		})
	}
}

// TestPanelAtTheGreatestWindow fills the largest window with the largest values, where the sum of squares nearly fills 128 bits,
// slides it, and scans it.
func TestPanelAtTheGreatestWindow(t *testing.T) {
	p := stats.NewPanel(2, stats.MaxWindow)
	m := model{window: stats.MaxWindow}
	for i := range stats.MaxWindow + 3 {
		k := stats.MaxValue * int64(1-i%2*2)
		p.Push([]int64{k, -stats.MaxValue})
		m.push(k)
	}
	checkSums(t, "alternating", p.Sums(0), m.values)
	checkSums(t, "all at the bottom", p.Sums(1), slices.Repeat([]int64{-stats.MaxValue}, stats.MaxWindow))
	for z, want := range map[float64][]int32{0.99: {0, 1}, 1.01: {1}} { // the top lies 1 deviation out; the other series is constant
		if got := p.Scan([]int64{stats.MaxValue, -stats.MaxValue}, stats.PlainGate(stats.MaxWindow, 2, stats.Fixed(z), false), nil); !slices.Equal(got, want) {
			t.Errorf("scan at z=%v: %v, want %v", z, got, want)
		}
	}
}

// TestSumsAnyOrder: adding, dropping and replacing in any order leaves the sums of what is left, shifted and scaled values have
// the same deviation to the last bit.
func TestSumsAnyOrder(t *testing.T) {
	for seed := range uint64(40) {
		r := rand.New(rand.NewPCG(seed, 13))
		var s stats.Sums
		var left []int64
		for range 300 {
			if n := len(left); n > 0 && r.IntN(3) == 0 {
				i := r.IntN(n)
				s.Drop(left[i])
				left[i] = left[n-1]
				left = left[:n-1]
				continue
			}
			k := regimesAny(r)
			s.Add(k)
			left = append(left, k)
		}
		checkSums(t, fmt.Sprintf("seed %d", seed), s, left)
		r.Shuffle(len(left), func(i, j int) { left[i], left[j] = left[j], left[i] })
		checkSums(t, fmt.Sprintf("seed %d shuffled", seed), s, left)
		for _, k := range left {
			s.Drop(k)
		}
		if s != (stats.Sums{}) {
			t.Errorf("seed %d: all dropped, yet %v is left", seed, s)
		}
	}
}

func TestShiftAndScale(t *testing.T) {
	for seed := range uint64(40) {
		r := rand.New(rand.NewPCG(seed, 17))
		shift := r.Int64N(1e15)
		var s, shifted, scaled stats.Sums
		values := returns(r, 60)
		for _, k := range values {
			s.Add(k)
			shifted.Add(k + shift)
			scaled.Add(k * 100)
		}
		want, _ := s.Deviation(one)
		moved, _ := shifted.Deviation(one)
		larger, _ := scaled.Deviation(100 * one)
		if moved != want || larger != want {
			t.Errorf("seed %d: deviation %v, shifted %v, scaled %v", seed, want, moved, larger)
		}
		k := values[0]
		if a, b, c := s.Distance(k, one), shifted.Distance(k+shift, one), scaled.Distance(100*k, 100*one); a != b || a != c {
			t.Errorf("seed %d: distance %v, shifted %v, scaled %v", seed, a, b, c)
		}
		off := new(big.Float).SetPrec(300).SetInt64(k)
		if u := ulps(t, s.Distance(k, one), off.Sub(off, exactly(values).mean), one); !(u <= 0.501) {
			t.Errorf("seed %d: distance is %v ulp off", seed, u)
		}
	}
}
