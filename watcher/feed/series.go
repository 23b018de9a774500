package feed

import (
	"bytes"
	"hash/maphash"
)

// recentNames is how many slots a parser has for the names that it met; a power of two.
const recentNames = 1 << 13

// takeSeries reads the name of a series. Files list series in the order of their numbers, or one series after another, so that
// name is compared first.
func (p *parser) takeSeries() bool {
	want := p.name
	if want == nil {
		want = p.names.Name(p.next - p.hint)
	}
	end := p.at + len(want)
	if len(want) > 0 && end < len(p.text) && p.ends(p.text[end]) && bytes.Equal(p.text[p.at:end], want) {
		p.at = end
		if p.name == nil {
			p.follow(p.next - p.hint)
		}
		return true
	}
	return p.take((*parser).judgeSeries)
}

func (p *parser) follow(id uint32) {
	p.id, p.next, p.name = id, id+1, nil
}

func (p *parser) judgeSeries(cell []byte) string {
	if len(cell) == 0 {
		return p.badName(cell)
	}
	if p.guess >= 0 && p.findNear(cell) {
		return ""
	}
	slot := &p.recent[maphash.Bytes(p.seed, cell)%recentNames]
	id, ok := *slot, p.names.Is(*slot, cell)
	if !ok {
		id, ok = p.names.Find(cell)
	}
	if !ok {
		p.name = cell
		return p.badName(cell)
	}
	*slot = id
	if id == p.next-1 {
		p.hint = 1
	} else if id == p.next {
		p.hint = 0
	}
	p.follow(id)
	return ""
}

// guessFirst reckons how many rows lie between the last chunk and this one. In a file of very many series in the order of their
// numbers that finds the first row's name nearby, and no table of all names need be made, which takes longer than to read the file; where they
// are fewer it makes no difference.
func (p *parser) guessFirst(c *chunk) int64 {
	if p.wide || len(c.text) == 0 || p.names.Len() <= 2*recentNames {
		return -1
	}
	rows := int64(bytes.Count(c.text, []byte{'\n'}))
	return int64(p.next) + (c.at-p.ended)*rows/int64(len(c.text))
}

// guessReach is how far from the guess a name is looked for.
const guessReach = 256

// findNear looks for the chunk's first unforeseen name around the guess, once.
func (p *parser) findNear(cell []byte) bool {
	guess := p.guess
	p.guess = -1
	for id := max(0, guess-guessReach); id < min(guess+guessReach, int64(p.names.Len())); id++ {
		if p.names.Is(uint32(id), cell) {
			p.hint = 0
			p.follow(uint32(id))
			return true
		}
	}
	return false
}
