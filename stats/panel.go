package stats

import "math/bits"

// Panel holds the windows of many series side by side: the last window values of each with their exact sums. Series advance
// on their own, so a series without a value today keeps its window; the layout is fastest when most have one. A Panel is not
// safe for use while it is changed.
type Panel struct {
	series, window int
	cells          []cell
	ring           []int64 // value of series i in slot j at j*series+i; 0 where the slot holds none
	narrow         int64   // values up to this size and
	small          uint64  // high words of sum(k^2) below this keep n k - S and D within two words
}

// cell is the state of one series: 32 bytes. slot is where the next value goes.
type cell struct {
	sLo, qLo, qHi uint64
	sHi           int32 // |S| < 2^72, so the high word of S is small
	slot, n       uint16
}

// NewPanel makes a panel of empty windows. window is from 1 to MaxWindow.
func NewPanel(series, window int) *Panel {
	checkWindow(window)
	return &Panel{
		series: series,
		window: window,
		cells:  make([]cell, series),
		ring:   make([]int64, series*window),
		// n |k| < 2^62; and n Q < 2^124, so that |S| <= sqrt(n Q) < 2^62 too (Cauchy and Schwarz). The size is never taken
		// beyond MaxValue, which Scan must report.
		narrow: min(1<<62/int64(window), MaxValue),
		small:  1 << 60 / uint64(window),
	}
}

func checkWindow(window int) {
	if window < 1 || window > MaxWindow {
		panic("stats: window out of range") // the settings are checked before any panel is made
	}
}

// Reset empties every window and keeps the memory.
func (p *Panel) Reset() {
	clear(p.cells)
	clear(p.ring)
}

// Clear empties the window of series i.
func (p *Panel) Clear(i int) {
	p.cells[i] = cell{}
	for at := i; at < len(p.ring); at += p.series {
		p.ring[at] = 0
	}
}

// N is how many values the window of series i holds.
func (p *Panel) N(i int) int { return int(p.cells[i].n) }

// Full says whether the window of series i is full.
func (p *Panel) Full(i int) bool { return int(p.cells[i].n) == p.window }

// Sums are the exact sums of the window of series i.
func (p *Panel) Sums(i int) Sums { return p.cells[i].sums() }

func (c *cell) sums() Sums {
	return Sums{int(c.n), Int128{int64(c.sHi), c.sLo}, Uint128{c.qHi, c.qLo}}
}

// Values appends the window of series i to dst, oldest first.
func (p *Panel) Values(i int, dst []int64) []int64 {
	c := p.cells[i]
	slot := (int(c.slot) + p.window - int(c.n)) % p.window
	for range c.n {
		dst = append(dst, p.ring[slot*p.series+i])
		slot = next(slot, p.window)
	}
	return dst
}

// Load makes the last window values of values, oldest first, the window of series i. Missing values are passed over.
func (p *Panel) Load(i int, values []int64) {
	p.Clear(i)
	for _, k := range values {
		if k != Missing {
			p.push(i, k)
		}
	}
}

func next(slot, window int) int {
	if slot++; slot == window {
		return 0
	}
	return slot
}

// Push takes every present value into the window of its series and drops the oldest of a full one. vals[i] belongs to series
// i; a shorter row leaves the others as they are. The caller has seen to it that no value is beyond MaxValue.
func (p *Panel) Push(vals []int64) {
	for i, k := range vals {
		if k != Missing {
			p.push(i, k)
		}
	}
}

// push replaces the slot's value by k. An unfilled slot holds 0, which adds nothing to either sum, so that filling and sliding
// are one step: S += k - old, and Q += k^2 - old^2 = (k - old)(k + old).
func (p *Panel) push(i int, k int64) {
	c := &p.cells[i]
	at := int(c.slot)*p.series + i
	old := p.ring[at]
	p.ring[at] = k
	c.take(k-old, k+old)
	c.slot = uint16(next(int(c.slot), p.window))
	if int(c.n) < p.window {
		c.n++
	}
}

// take adds diff to the sum and diff times sum, a difference of squares, to the sum of squares.
func (c *cell) take(diff, sum int64) {
	lo, carry := bits.Add64(c.sLo, uint64(diff), 0)
	c.sLo, c.sHi = lo, c.sHi+int32(diff>>63)+int32(carry)
	hi, lo := bits.Mul64(uint64(diff), uint64(sum))
	hi -= uint64(diff>>63&sum + sum>>63&diff)
	c.qLo, carry = bits.Add64(c.qLo, lo, 0)
	c.qHi, _ = bits.Add64(c.qHi, hi, carry)
}

// Prepend puts every present value in front of the window of its series, as its oldest, where that is not full yet: a load
// from the newest column back to the oldest. Push continues from there.
func (p *Panel) Prepend(vals []int64) {
	for i, k := range vals {
		c := &p.cells[i]
		if k == Missing || int(c.n) == p.window {
			continue
		}
		c.n++
		slot := int(c.slot) - int(c.n)
		if slot < 0 {
			slot += p.window
		}
		p.ring[slot*p.series+i] = k
		c.take(k, k)
	}
}

// Scan appends to cand the index of every present value that is not surely inside: the gate does not hold it, all values of
// the window are equal, or the value is beyond MaxValue. It changes nothing else.
func (p *Panel) Scan(vals []int64, gate Gate, cand []int32) []int32 {
	return scan(p.cells, p.narrow, p.small, vals, gate, cand)
}

func scan(cells []cell, narrow int64, small uint64, vals []int64, gate Gate, cand []int32) []int32 {
	for i, k := range vals {
		c := &cells[i]
		if uint64(k+narrow) > uint64(2*narrow) || c.qHi >= small {
			if k != Missing && !c.holds(k, gate[c.n]) {
				cand = append(cand, int32(i))
			}
			continue
		}
		n := uint64(c.n)
		far := float64(int64(n)*k - int64(c.sLo))
		if !(float64(far*far) < float64(gate[n]*c.spread())) {
			cand = append(cand, int32(i))
		}
	}
	return cand
}

// spread is D or one less, rounded, for windows whose high word of Q is small: erring low only asks for a closer look. The halves are
// converted as signed numbers, which is the faster conversion.
func (c *cell) spread() float64 {
	n := uint64(c.n)
	hi, lo := bits.Mul64(n, c.qLo)
	hi += n * c.qHi
	sign := int64(c.sLo) >> 63
	s := uint64((int64(c.sLo) ^ sign) - sign)
	sHi, sLo := bits.Mul64(s, s)
	lo, borrow := bits.Sub64(lo, sLo, 0)
	hi, _ = bits.Sub64(hi, sHi, borrow)
	return float64(float64(int64(hi))*0x1p64) + float64(float64(int64(lo>>1))*2)
}

// holds is the gate for values and windows of any size.
func (c *cell) holds(k int64, limit float64) bool {
	if k > MaxValue || k < -MaxValue {
		return false
	}
	s := c.sums()
	far, spread := s.offset(k).pair().float(), s.spread().pair().float()
	return float64(far*far) < float64(limit*spread)
}
