package ledger

import (
	"encoding/binary"

	"strayd/watcher"
)

// longestName is how many bytes a name may have.
const longestName = 1<<16 - 1

// A chunk of names after its seal: count u16, width u8 of a length (1 or 2), lengths, the names laid end to end.

type chunk struct {
	n, width int
	lengths  []byte
	text     []byte
}

func parseChunk(v []byte) (chunk, bool) {
	if len(v) < 3 {
		return chunk{}, false
	}
	c := chunk{n: int(binary.LittleEndian.Uint16(v)), width: int(v[2])}
	if c.width != 1 && c.width != 2 || len(v) < 3+c.n*c.width || c.n > watcher.BlockSize {
		return chunk{}, false
	}
	c.lengths, c.text = v[3:3+c.n*c.width], v[3+c.n*c.width:]
	total := 0
	for i := range c.n {
		total += c.length(i)
	}
	return c, total == len(c.text)
}

func (c *chunk) length(i int) int {
	if c.width == 1 {
		return int(c.lengths[i])
	}
	return int(binary.LittleEndian.Uint16(c.lengths[2*i:]))
}

// names copies the names out of the map.
func (c *chunk) names() [][]byte {
	text := append([]byte(nil), c.text...)
	names := make([][]byte, c.n)
	for i := range names {
		names[i], text = text[:c.length(i):c.length(i)], text[c.length(i):]
	}
	return names
}

// appendEnds adds where each name stops, the first starting at from.
func (c *chunk) appendEnds(ends []uint32, from uint32) []uint32 {
	if c.width == 1 {
		for _, n := range c.lengths {
			from += uint32(n)
			ends = append(ends, from)
		}
		return ends
	}
	for i := range c.n {
		from += uint32(c.length(i))
		ends = append(ends, from)
	}
	return ends
}

func packNames(dst []byte, names [][]byte) []byte {
	width := 1
	for _, n := range names {
		if len(n) > 255 {
			width = 2
		}
	}
	dst = binary.LittleEndian.AppendUint16(dst, uint16(len(names)))
	dst = append(dst, byte(width))
	for _, n := range names {
		if width == 1 {
			dst = append(dst, byte(len(n)))
		} else {
			dst = binary.LittleEndian.AppendUint16(dst, uint16(len(n)))
		}
	}
	for _, n := range names {
		dst = append(dst, n...)
	}
	return dst
}
