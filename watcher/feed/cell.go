package feed

import "bytes"

// cursor walks over text that ends in a newline, cell by cell.
type cursor struct {
	text      []byte
	at        int
	line      uint32 // newlines before lineStart
	lineStart int
	sep       byte
	flat      bool   // every line is a record, whatever its cells hold: a grid laid out as text
	arena     []byte // holds the cells whose doubled quotes were taken out
}

// Faults of quoting. After one of them the rest of the file cannot be trusted.
const (
	quoteInside = `a quote stands inside a cell that does not begin with one; quote the whole cell and double the quotes in it`
	quoteAfter  = `text follows the closing quote of a cell`
	quoteOpen   = `a quoted cell is never closed`
)

// space says whether a byte around a cell is left out.
func (c *cursor) space(b byte) bool { return b == ' ' || b == '\t' && c.sep != '\t' }

// ends says whether a byte ends an unquoted cell.
func (c *cursor) ends(b byte) bool { return b == c.sep || b == '\n' || b == '\r' }

// cell reads the cell at the cursor without its quotes and the spaces around it, and leaves the cursor on the separator or on
// the end of the line. The problem is one of the faults of quoting, or empty. (RFC 4180, section 2, rules 4 to 7; spaces
// around a cell are let through.)
func (c *cursor) cell() (cell []byte, problem string) {
	from := c.at
	for c.space(c.text[from]) {
		from++
	}
	if c.text[from] == '"' {
		return c.quoted(from + 1)
	}
	end := from
	for b := c.text[end]; b != c.sep && b != '\n'; b = c.text[end] {
		if b == '"' {
			c.at = end
			return c.text[from:end], quoteInside
		}
		end++
	}
	if c.text[end] == '\n' && end > from && c.text[end-1] == '\r' {
		end--
	}
	c.at = end
	for end > from && c.space(c.text[end-1]) {
		end--
	}
	return c.text[from:end], ""
}

// quoted reads on after an opening quote.
func (c *cursor) quoted(from int) ([]byte, string) {
	at, doubled := from, false
	for {
		i := bytes.IndexByte(c.text[at:], '"')
		if i < 0 {
			c.at = len(c.text) - 1
			return c.text[from : len(c.text)-1], quoteOpen
		}
		at += i + 1
		if at == len(c.text) || c.text[at] != '"' {
			break
		}
		at++
		doubled = true
	}
	inner := c.text[from : at-1]
	c.crossLines(from, at-1)
	for at < len(c.text) && c.space(c.text[at]) {
		at++
	}
	c.at = at
	if !c.ends(c.text[at]) {
		return inner, quoteAfter
	}
	if doubled {
		inner = c.undouble(inner)
	}
	return c.trimmed(inner), ""
}

// crossLines counts the newlines within a quoted cell.
func (c *cursor) crossLines(from, to int) {
	for !c.flat {
		i := bytes.IndexByte(c.text[from:to], '\n')
		if i < 0 {
			return
		}
		from += i + 1
		c.line++
		c.lineStart = from
	}
}

func (c *cursor) undouble(s []byte) []byte {
	from := len(c.arena)
	for i := 0; i < len(s); i++ {
		c.arena = append(c.arena, s[i])
		if s[i] == '"' {
			i++
		}
	}
	return c.arena[from:len(c.arena):len(c.arena)]
}

func (c *cursor) trimmed(s []byte) []byte {
	for len(s) > 0 && c.space(s[0]) {
		s = s[1:]
	}
	for len(s) > 0 && c.space(s[len(s)-1]) {
		s = s[:len(s)-1]
	}
	return s
}

// separator steps over one.
func (c *cursor) separator() bool {
	if c.text[c.at] != c.sep {
		return false
	}
	c.at++
	return true
}

// endOfLine steps over LF or CRLF.
func (c *cursor) endOfLine() bool {
	at := c.at
	if c.text[at] == '\r' {
		at++
	}
	if at >= len(c.text) || c.text[at] != '\n' {
		return false
	}
	c.at = at + 1
	c.line++
	c.lineStart = c.at
	return true
}

// blank steps over a line of nothing but spaces.
func (c *cursor) blank() bool {
	at := c.at
	for c.space(c.text[at]) {
		at++
	}
	if c.text[at] != '\n' && c.text[at] != '\r' {
		return false
	}
	was := c.at
	c.at = at
	if c.endOfLine() {
		return true
	}
	c.at = was
	return false
}

// record counts the cells from the cursor to the end of the record and steps over it. The problem is a fault of quoting.
func (c *cursor) record() (cells int, problem string) {
	for {
		if _, problem = c.cell(); problem != "" {
			return cells, problem
		}
		cells++
		if c.separator() {
			continue
		}
		if c.endOfLine() {
			return cells, ""
		}
		c.at++ // a carriage return that stands alone after a quoted cell
	}
}
