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
