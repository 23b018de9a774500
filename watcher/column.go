package watcher

import (
	"math"

	"strayd/rules"
)

const (
	// BlockSize is how many series share a column. Two full int32 columns with their headers fill eight 4 KiB pages exactly.
	BlockSize = 4080
	// Missing32 and Missing64 stand in a column where a series has no value.
	Missing32 = math.MinInt32
	Missing64 = math.MinInt64
)

// What says which of the stored quantities a column holds.
type What uint8

const (
	Returns What = iota // at rules.Places decimals when decoded
	Prices              // at rules.PricePlaces
)

// Places is the number of decimals of the decoded integers.
func (w What) Places() int {
	if w == Prices {
		return rules.PricePlaces
	}
	return rules.Places
}

// Column holds the values of one date for the series [Block*BlockSize, (Block+1)*BlockSize). Exactly one of V32 and V64 is
// set; its index is the series' offset in the block, its length the highest offset with a value plus one. A value is
// V x 10^-Decimals.
type Column struct {
	Date     rules.Date
	Block    uint32
	Decimals uint8
	V32      []int32
	V64      []int64
	Lines    Lines
}

// Lines tells which line of the file each present cell came from. With At nil, the cells in order of their offset came from
// lines First, First+Stride, First+2 Stride and so on, absent cells not counted. Else At[offset] is the line, 0 where absent.
type Lines struct {
	First, Stride uint32
	At            []uint32
}

// Len is the highest offset that has a value, plus one.
func (c *Column) Len() int { return max(len(c.V32), len(c.V64)) }

// Fill writes the values of the offsets from, from+1, ... into dst as integers at the given number of places, Missing64 where
// the column has none. places is at least Decimals.
func (c *Column) Fill(dst []int64, from, places int) {
	mul := int64(rules.Pow10(places - int(c.Decimals)))
	n := 0
	if c.V32 != nil {
		if from < len(c.V32) {
			n = fill32(dst, c.V32[from:], mul)
		}
	} else if from < len(c.V64) {
		n = fill64(dst, c.V64[from:], mul)
	}
	for i := n; i < len(dst); i++ {
		dst[i] = Missing64
	}
}

func fill32(dst []int64, src []int32, mul int64) int {
	n := min(len(dst), len(src))
	dst, src = dst[:n], src[:n]
	for i, v := range src {
		if v == Missing32 {
			dst[i] = Missing64
		} else {
			dst[i] = int64(v) * mul
		}
	}
	return n
}

func fill64(dst, src []int64, mul int64) int {
	n := min(len(dst), len(src))
	dst, src = dst[:n], src[:n]
	for i, v := range src {
		if v == Missing64 {
			dst[i] = Missing64
		} else {
			dst[i] = v * mul
		}
	}
	return n
}

// Line is the source line of the cell at an offset, 0 when the cell is absent.
func (c *Column) Line(offset int) uint32 {
	if offset >= c.Len() || !c.has(offset) {
		return 0
	}
	if c.Lines.At != nil {
		return c.Lines.At[offset]
	}
	return c.Lines.First + uint32(c.rank(offset))*c.Lines.Stride
}

// rank counts the present cells before an offset.
func (c *Column) rank(offset int) (n int) {
	if c.V32 != nil {
		for _, v := range c.V32[:offset] {
			if v != Missing32 {
				n++
			}
		}
		return n
	}
	for _, v := range c.V64[:offset] {
		if v != Missing64 {
			n++
		}
	}
	return n
}

// AllLines is the source line of each offset, 0 where a cell is absent. It must not be changed.
func (c *Column) AllLines() []uint32 {
	if c.Lines.At != nil {
		return c.Lines.At
	}
	at := make([]uint32, c.Len())
	line := c.Lines.First
	for i := range at {
		if c.has(i) {
			at[i] = line
			line += c.Lines.Stride
		}
	}
	return at
}

func (c *Column) has(i int) bool {
	if c.V32 != nil {
		return c.V32[i] != Missing32
	}
	return c.V64[i] != Missing64
}
