package feed

import (
	"bytes"

	"strayd/watcher"
)

// wideHeader gives every column its series. It keeps no list of the names: there may be a million.
func (p *plan) wideHeader(c *cursor, names *watcher.Names) *fault {
	end := bytes.IndexByte(c.text[c.at:], '\n')
	p.dateAt, p.ids = -1, make([]uint32, 0, 1+bytes.Count(c.text[c.at:c.at+end], []byte{c.sep}))
	var first []headerCell // as many as a message shows
	var taken []bool       // by number of the series
	next := uint32(0)
	bad := p.eachCell(c, func(h headerCell) *fault {
		if len(first) < shownNames {
			first = append(first, h)
		}
		if string(h.name) == p.feed.Columns.Date {
			if p.dateAt >= 0 {
				return h.bad(columnTwice)
			}
			p.dateAt, p.ids = len(p.ids), append(p.ids, watcher.NoSeries)
			return nil
		}
		id, reason := p.wideName(h.name, names, next)
		if reason != "" {
			return h.bad(reason)
		}
		if int(id) >= len(taken) {
			taken = append(taken, make([]bool, int(id)+cap(p.ids)-len(taken))...)
		}
		if taken[id] {
			return h.bad(columnTwice)
		}
		taken[id], next = true, id+1
		p.ids = append(p.ids, id)
		return nil
	})
	if bad == nil {
		bad = p.firstLine(first)
	}
	if bad == nil && p.dateAt < 0 {
		bad = noColumn(first, p.feed.Columns.Date)
	}
	p.width = len(p.ids)
	return bad
}

// wideName is the number of a series of the header, which is most often the next one.
func (p *plan) wideName(name []byte, names *watcher.Names, next uint32) (id uint32, reason string) {
	if names.Is(next, name) {
		return next, ""
	}
	if len(name) == 0 {
		return 0, columnNameless
	}
	if reason := p.badName(name); reason != "" {
		return 0, reason
	}
	return names.Add(name), ""
}
