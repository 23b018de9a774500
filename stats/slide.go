package stats

import "slices"

// Slide holds the exact sums of many windows without their values, to be moved on by one row: whoever moves it hands over the row
// that leaves the windows too. Most series have a value in every row and share that rhythm; one that misses rows is apart and keeps
// its own values. A Slide is not safe for use while it is changed.
type Slide struct {
	window int
	cells  []cell
	apart  map[int32]*apart
	narrow int64
	small  uint64
}

// apart is the window of a series that has missed a row: its values, oldest first, and how many rows it has had a value in since.
type apart struct {
	values []int64
	run    int
}

// Slide takes the sums of the first series of a panel. together says which of them hold the values of the same rows: the newest
// ones, without a gap. Rows longer than that are of no use, so that Push takes rows of this many series.
func (p *Panel) Slide(series int, together func(i int) bool) *Slide {
	s := &Slide{window: p.window, cells: slices.Clone(p.cells[:series]), apart: map[int32]*apart{}, narrow: p.narrow, small: p.small}
	for i := range series {
		if !together(i) {
			s.apart[int32(i)] = &apart{values: p.Values(i, make([]int64, 0, p.window))}
		}
	}
	return s
}

// Apart is how many series are apart.
func (s *Slide) Apart() int { return len(s.apart) }

// Set puts a series apart, with the values of its window, oldest first.
func (s *Slide) Set(i int, values []int64) { s.apart[int32(i)] = &apart{values: values} }

// Reset empties every window.
func (s *Slide) Reset() {
	for i := range s.cells {
		s.Clear(i)
	}
}

// Clear empties the window of series i and puts it apart.
func (s *Slide) Clear(i int) {
	s.cells[i] = cell{}
	s.Set(i, nil)
}

// N is how many values the window of series i holds.
func (s *Slide) N(i int) int { return int(s.cells[i].n) }

// Sums are the exact sums of the window of series i.
func (s *Slide) Sums(i int) Sums { return s.cells[i].sums() }

// Scan is Panel.Scan.
func (s *Slide) Scan(vals []int64, gate Gate, cand []int32) []int32 {
	return scan(s.cells, s.narrow, s.small, vals, gate, cand)
}

// Push takes a row into the windows: each present value, for the one of the same series in leaving where the window is full. It gives
// the series that have no value in the row and were not apart: they keep their window, and must be Set before the next row.
// leaving may be nil while no window is full.
func (s *Slide) Push(vals, leaving []int64) (lost []int32) {
	for i, k := range vals {
		if len(s.apart) > 0 {
			if own := s.apart[int32(i)]; own != nil {
				s.pushApart(int32(i), own, k)
				continue
			}
		}
		c := &s.cells[i]
		switch {
		case k == Missing:
			lost = append(lost, int32(i))
		case int(c.n) < s.window:
			c.n++
			c.take(k, k)
		default:
			c.take(k-leaving[i], k+leaving[i])
		}
	}
	return lost
}

// pushApart moves a window of its own on. A series is with the others again once it has had a value in as many rows as a window holds.
func (s *Slide) pushApart(i int32, own *apart, k int64) {
	if k == Missing {
		own.run = 0
		return
	}
	old := int64(0)
	if len(own.values) == s.window {
		old = own.values[0]
		own.values = append(own.values[:0], own.values[1:]...)
	} else {
		s.cells[i].n++
	}
	own.values = append(own.values, k)
	s.cells[i].take(k-old, k+old)
	if own.run++; own.run >= s.window {
		delete(s.apart, i)
	}
}
