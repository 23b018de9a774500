package feed

import (
	"bytes"
	"fmt"
	"slices"
	"strings"

	"strayd/watcher"
)

const (
	columnTwice    = "the header has this column twice"
	columnNameless = "a column of the header has no name"
)

// headerCell is one name of the header with its place.
type headerCell struct {
	name   []byte // within the text
	column int    // byte column, from 1
}

// shownNames is how many names of a header a message lists.
const shownNames = 20

// header reads the first record that is not blank and completes the plan from it. ok is false while there is none.
func (p *plan) header(c *cursor, names *watcher.Names) (ok bool, bad *fault) {
	for c.at < len(c.text) && c.blank() {
	}
	if c.at == len(c.text) {
		return false, nil
	}
	line, from := c.line, c.at
	if p.wide {
		bad = p.wideHeader(c, names)
	} else {
		bad = p.longHeader(c)
	}
	if c.at-from > p.limits.LineBytes {
		bad = &fault{reason: tooLong(p.limits.LineBytes)}
	}
	if bad != nil {
		bad.line = line
	}
	return true, bad
}

// eachCell walks over the cells of a record and steps over it. It stops at the first fault.
func (p *plan) eachCell(c *cursor, take func(headerCell) *fault) *fault {
	for n := 0; ; n++ {
		start := c.at
		cell := headerCell{column: c.column(c.at, c.lineStart)}
		var problem string
		cell.name, problem = c.cell()
		switch {
		case problem != "":
		case n >= p.limits.Columns:
			return &fault{column: cell.column, reason: fmt.Sprintf("the header has more than %d columns, the limit", p.limits.Columns)}
		case bytes.IndexByte(c.text[start:c.at], '\r') >= 0:
			problem = carriageReturn
		default:
			problem = p.badText(cell.name)
		}
		if problem != "" {
			return cell.bad(problem)
		}
		if bad := take(cell); bad != nil {
			return bad
		}
		if !c.separator() {
			break
		}
	}
	if !c.endOfLine() {
		return &fault{reason: carriageReturn}
	}
	return nil
}

func (h headerCell) bad(reason string) *fault {
	return &fault{column: h.column, cell: string(h.name), reason: reason}
}

// cells lists the cells of a record.
func (p *plan) cells(c *cursor) (cells []headerCell, bad *fault) {
	bad = p.eachCell(c, func(h headerCell) *fault {
		cells = append(cells, h)
		return nil
	})
	return cells, bad
}

// firstLine refuses what is no header at all.
func (p *plan) firstLine(cells []headerCell) *fault {
	first := cells[0]
	if len(first.name) >= 4 && strings.EqualFold(string(first.name[:4]), "sep=") {
		return first.bad("the file begins with a spreadsheet's separator line, not with the header; deliver it without, and declare the " +
			"separator in the feed")
	}
	if len(cells) > 1 {
		return nil
	}
	for _, sep := range []byte(",;\t|") {
		if sep != p.comma && bytes.IndexByte(first.name, sep) >= 0 {
			return first.bad(fmt.Sprintf("the header has no %q but has %q; is the feed's separator right?", p.comma, sep))
		}
	}
	return nil
}

func (p *plan) longHeader(c *cursor) *fault {
	cells, bad := p.cells(c)
	if bad == nil {
		bad = p.firstLine(cells)
	}
	if bad != nil {
		return bad
	}
	want := p.feed.Columns
	p.width, p.roles = len(cells), make([]role, len(cells))
	for _, w := range []struct {
		name string
		role role
	}{{want.Date, roleDate}, {want.Series, roleSeries}, {want.Value, roleValue}, {want.Status, roleStatus}, {want.Days, roleDays}} {
		if w.name == "" {
			continue
		}
		at := columnNamed(cells, w.name)
		if at < 0 {
			return noColumn(cells, w.name)
		}
		p.roles[at] = w.role
	}
	return repeated(cells, true)
}

// columnNamed is the place of a column, -1 when there is none.
func columnNamed(cells []headerCell, name string) int {
	return slices.IndexFunc(cells, func(h headerCell) bool { return string(h.name) == name })
}

// noColumn says that a declared column is not there.
func noColumn(cells []headerCell, name string) *fault {
	var has []string
	reason := fmt.Sprintf("the header has no column %q", name)
	for _, h := range cells[:min(len(cells), shownNames)] {
		if strings.EqualFold(string(h.name), name) {
			return &fault{reason: reason + fmt.Sprintf(" but has %q: capitals count", h.name)}
		}
		has = append(has, string(h.name))
	}
	return &fault{reason: reason + "; it has", cell: strings.Join(has, ", ")}
}

// repeated refuses a name that the header has twice. In a long file a column that nobody uses may lack a name.
func repeated(cells []headerCell, blankOK bool) *fault {
	seen := make(map[string]bool, len(cells))
	for _, h := range cells {
		switch name := string(h.name); {
		case name == "" && blankOK:
		case name == "":
			return h.bad(columnNameless)
		case seen[name]:
			return h.bad(columnTwice)
		}
		seen[string(h.name)] = true
	}
	return nil
}
