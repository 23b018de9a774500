package feed

import (
	"bytes"
	"fmt"
	"slices"
	"strings"

	"strayd/watcher"
)

const columnTwice = "the header has this column twice"

// headerCell is one name of the header with its place.
type headerCell struct {
	name   string
	column int // byte column, from 1
}

// header reads the first record that is not blank and completes the plan from it. ok is false while there is none.
func (p *plan) header(c *cursor, names *watcher.Names) (ok bool, bad *fault) {
	for c.at < len(c.text) && c.blank() {
	}
	if c.at == len(c.text) {
		return false, nil
	}
	line, from := c.line, c.at
	cells, bad := p.headerCells(c)
	if c.at-from > p.limits.LineBytes {
		bad = &fault{reason: tooLong(p.limits.LineBytes)}
	}
	if bad == nil {
		bad = p.firstLine(cells)
	}
	if bad == nil && p.wide {
		bad = p.wideHeader(cells, names)
	} else if bad == nil {
		bad = p.longHeader(cells)
	}
	if bad != nil {
		bad.line = line
	}
	p.width = len(cells)
	return true, bad
}

func (p *plan) headerCells(c *cursor) (cells []headerCell, bad *fault) {
	for {
		start := c.at
		column := c.at - c.lineStart + 1
		text, problem := c.cell()
		switch {
		case problem != "":
			return nil, &fault{column: column, cell: string(text), reason: problem}
		case len(cells) >= p.limits.Columns:
			return nil, &fault{column: column, reason: fmt.Sprintf("the header has more than %d columns, the limit", p.limits.Columns)}
		case bytes.IndexByte(c.text[start:c.at], '\r') >= 0:
			return nil, &fault{column: column, cell: string(text), reason: carriageReturn}
		}
		if problem := p.badText(text); problem != "" {
			return nil, &fault{column: column, cell: string(text), reason: problem}
		}
		cells = append(cells, headerCell{string(text), column})
		if !c.separator() {
			break
		}
	}
	if !c.endOfLine() {
		return nil, &fault{reason: carriageReturn}
	}
	return cells, nil
}

// firstLine refuses what is no header at all.
func (p *plan) firstLine(cells []headerCell) *fault {
	if first := cells[0].name; len(first) >= 4 && strings.EqualFold(first[:4], "sep=") {
		return &fault{column: 1, cell: first, reason: "the file begins with a spreadsheet's separator line, not with the header; " +
			"deliver it without, and declare the separator in the feed"}
	}
	if len(cells) > 1 {
		return nil
	}
	for _, sep := range ",;\t|" {
		if byte(sep) != p.comma && strings.ContainsRune(cells[0].name, sep) {
			return &fault{column: 1, cell: cells[0].name,
				reason: fmt.Sprintf("the header has no %q but has %q; is the feed's separator right?", p.comma, byte(sep))}
		}
	}
	return nil
}

func (p *plan) longHeader(cells []headerCell) *fault {
	want := p.feed.Columns
	p.roles = make([]role, len(cells))
	for _, w := range []struct {
		name string
		role role
	}{{want.Date, roleDate}, {want.Series, roleSeries}, {want.Value, roleValue}, {want.Status, roleStatus}, {want.Days, roleDays}} {
		if w.name == "" {
			continue
		}
		at, bad := columnNamed(cells, w.name)
		if bad != nil {
			return bad
		}
		p.roles[at] = w.role
	}
	return repeated(cells, true)
}

// columnNamed finds a declared column.
func columnNamed(cells []headerCell, name string) (int, *fault) {
	has := make([]string, len(cells))
	for i, c := range cells {
		if c.name == name {
			return i, nil
		}
		has[i] = c.name
	}
	reason := fmt.Sprintf("the header has no column %q", name)
	if i := slices.IndexFunc(has, func(h string) bool { return strings.EqualFold(h, name) }); i >= 0 {
		reason += fmt.Sprintf(" but has %q: capitals count", has[i])
		return 0, &fault{reason: reason}
	}
	return 0, &fault{reason: reason + "; it has", cell: strings.Join(has, ", ")}
}

// repeated refuses a name that the header has twice. In a long file a column that nobody uses may lack a name.
func repeated(cells []headerCell, blankOK bool) *fault {
	seen := make(map[string]bool, len(cells))
	for _, c := range cells {
		switch {
		case c.name == "" && blankOK:
		case c.name == "":
			return &fault{column: c.column, reason: "a column of the header has no name"}
		case seen[c.name]:
			return &fault{column: c.column, cell: c.name, reason: columnTwice}
		}
		seen[c.name] = true
	}
	return nil
}

// wideHeader gives every column its series.
func (p *plan) wideHeader(cells []headerCell, names *watcher.Names) *fault {
	at, bad := columnNamed(cells, p.feed.Columns.Date)
	if bad != nil {
		return bad
	}
	p.dateAt, p.ids = at, make([]uint32, len(cells))
	var taken []bool // by number of the series
	next := uint32(0)
	for i, c := range cells {
		if i == at {
			p.ids[i] = watcher.NoSeries
			continue
		}
		id, reason := p.wideName(c.name, names, next)
		if reason != "" {
			return &fault{column: c.column, cell: c.name, reason: reason}
		}
		if int(id) >= len(taken) {
			taken = append(taken, make([]bool, int(id)+len(cells)-len(taken))...)
		}
		if taken[id] || c.name == p.feed.Columns.Date {
			return &fault{column: c.column, cell: c.name, reason: columnTwice}
		}
		p.ids[i], taken[id], next = id, true, id+1
	}
	return nil
}

// wideName is the number of a series of the header, which is most often the next one.
func (p *plan) wideName(name string, names *watcher.Names, next uint32) (id uint32, reason string) {
	if names.Is(next, []byte(name)) {
		return next, ""
	}
	if name == "" {
		return 0, "a column of the header has no name"
	}
	if reason := p.badName([]byte(name)); reason != "" {
		return 0, reason
	}
	return names.Add([]byte(name)), ""
}
