package stats

import "slices"

// SortedPanel holds the windows of many series side by side, each in the order of arrival and in the order of size: for
// medians, median absolute deviations, ranks and order statistics. A step costs a search and a move of up to a window, a
// median nothing and a MAD a search.
type SortedPanel struct {
	window int
	cells  []place
	ring   []int64 // value of series i in slot j at i*window+j
	sorted []int64 // the n values of series i from i*window, ascending
}

// place is where the next value of a series goes, and how many values its window holds.
type place struct{ slot, n uint16 }

// NewSortedPanel makes a panel of empty windows. window is from 1 to MaxWindow.
func NewSortedPanel(series, window int) *SortedPanel {
	checkWindow(window)
	return &SortedPanel{window, make([]place, series), make([]int64, series*window), make([]int64, series*window)}
}

// Reset empties every window and keeps the memory.
func (p *SortedPanel) Reset() { clear(p.cells) }

// Clear empties the window of series i.
func (p *SortedPanel) Clear(i int) { p.cells[i] = place{} }

// N is how many values the window of series i holds.
func (p *SortedPanel) N(i int) int { return int(p.cells[i].n) }

// Full says whether the window of series i is full.
func (p *SortedPanel) Full(i int) bool { return int(p.cells[i].n) == p.window }

// Sorted is the window of series i, ascending. It is valid until the panel changes and must not be changed.
func (p *SortedPanel) Sorted(i int) Sorted {
	return p.sorted[i*p.window : i*p.window+int(p.cells[i].n) : (i+1)*p.window]
}

// Values appends the window of series i to dst, oldest first.
func (p *SortedPanel) Values(i int, dst []int64) []int64 {
	ring, n, slot := p.ring[i*p.window:][:p.window], int(p.cells[i].n), int(p.cells[i].slot)
	if n <= slot {
		return append(dst, ring[slot-n:slot]...)
	}
	return append(append(dst, ring[p.window+slot-n:]...), ring[:slot]...)
}

// Load makes the last window values of values, oldest first, the window of series i. Missing values are passed over.
func (p *SortedPanel) Load(i int, values []int64) {
	p.Clear(i)
	for _, k := range values {
		if k != Missing {
			p.push(i, k)
		}
	}
}

// Push takes every present value into the window of its series and drops the oldest of a full one. The caller has seen to it
// that no value is beyond MaxValue.
func (p *SortedPanel) Push(vals []int64) {
	for i, k := range vals {
		if k != Missing {
			p.push(i, k)
		}
	}
}

func (p *SortedPanel) push(i int, k int64) {
	c := &p.cells[i]
	at := i*p.window + int(c.slot)
	if int(c.n) == p.window {
		p.Sorted(i).replace(p.ring[at], k)
	} else {
		p.insert(i, k)
	}
	p.ring[at] = k
	c.slot = uint16(next(int(c.slot), p.window))
}

func (p *SortedPanel) insert(i int, k int64) {
	at, _ := slices.BinarySearch(p.Sorted(i), k)
	p.cells[i].n++
	w := p.Sorted(i)
	copy(w[at+1:], w[at:])
	w[at] = k
}

// replace takes old out and puts k in, keeping the order.
func (w Sorted) replace(old, k int64) {
	from, _ := slices.BinarySearch(w, old)
	to, _ := slices.BinarySearch(w, k)
	if to > from {
		to--
		copy(w[from:to], w[from+1:to+1])
	} else {
		copy(w[to+1:from+1], w[to:from])
	}
	w[to] = k
}

// Prepend puts every present value in front of the window of its series, as its oldest, where that is not full yet: a load
// from the newest column back to the oldest. Push continues from there.
func (p *SortedPanel) Prepend(vals []int64) {
	for i, k := range vals {
		c := &p.cells[i]
		if k == Missing || int(c.n) == p.window {
			continue
		}
		slot := int(c.slot) - int(c.n) - 1
		if slot < 0 {
			slot += p.window
		}
		p.ring[i*p.window+slot] = k
		p.insert(i, k)
	}
}

// Scan appends to cand the index of every present value that is not surely inside the MAD lines: the gate (MADGate) does not
// hold it, the MAD is 0, or the value is beyond MaxValue. It changes nothing else.
func (p *SortedPanel) Scan(vals []int64, gate Gate, cand []int32) []int32 {
	for i, k := range vals {
		if k == Missing {
			continue
		}
		inside := false
		if w, limit := p.Sorted(i), gate[p.cells[i].n]; limit > 0 && uint64(k+MaxValue) <= 2*MaxValue {
			far := float64(2 * distance(2*k, w.median2()))
			inside = far < float64(limit*float64(w.mad4()))
		}
		if !inside {
			cand = append(cand, int32(i))
		}
	}
	return cand
}

// ScanRank appends to cand the index of every present value that is not between the marks[n]-th smallest and the marks[n]-th
// greatest of its window of n values (both included), or is beyond MaxValue. Where marks[n] is below 1 every value is
// appended. See RankMark.
func (p *SortedPanel) ScanRank(vals []int64, marks []int, cand []int32) []int32 {
	for i, k := range vals {
		if k == Missing {
			continue
		}
		w := p.Sorted(i)
		low, high, ok := w.Lines(marks[len(w)])
		if !ok || k < low || k > high || uint64(k+MaxValue) > 2*MaxValue {
			cand = append(cand, int32(i))
		}
	}
	return cand
}
