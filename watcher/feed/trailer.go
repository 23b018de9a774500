package feed

import (
	"bytes"
	"fmt"
	"math/big"
	"strconv"

	"strayd/rules"
	"strayd/watcher"
)

// A file may end in control totals, each in a line of its own: "#rows 24", the number of its rows, and "#total 3.1234", the sum of its
// values as they are written. Where one stands, the file must have it.

// trailer is one control total.
type trailer struct {
	line   uint32 // within the chunk, from 0; of the file once merged
	total  bool   // else rows
	number []byte
}

var (
	rowsMark  = []byte("#rows ")
	totalMark = []byte("#total ")
)

// trailer reads a control total at the cursor and steps over it. ok is false when there is none.
func (p *parser) trailer() (ok bool) {
	end := bytes.IndexByte(p.text[p.at:], '\n')
	text := bytes.TrimSpace(p.text[p.at : p.at+end])
	t := trailer{line: p.line}
	switch {
	case bytes.HasPrefix(text, rowsMark):
		t.number = bytes.TrimSpace(text[len(rowsMark):])
	case bytes.HasPrefix(text, totalMark):
		t.number, t.total = bytes.TrimSpace(text[len(totalMark):]), true
	default:
		return false
	}
	t.number = bytes.Clone(t.number)
	p.out.trailers = append(p.out.trailers, t)
	p.at += end + 1
	p.line++
	p.lineStart = p.at
	return true
}

// afterTrailer is the fault of a row that follows a control total.
func (p *parser) afterTrailer() fault {
	return fault{line: p.line, reason: "a row follows the control totals, which end a file", fatal: true}
}

// takeTrailers keeps the control totals of a chunk. Rows in a later chunk are a fault.
func (m *merger) takeTrailers(c *chunk) {
	if len(m.trailers) > 0 && c.records > 0 {
		m.bad = &fault{line: uint32(m.line) + 1, reason: "a row follows the control totals, which end a file"}
	}
	for _, t := range c.trailers {
		t.line += uint32(m.line) + 1
		m.trailers = append(m.trailers, t)
	}
	m.records += c.records
}

// checkTrailers holds the file against its control totals.
func (m *merger) checkTrailers() {
	for _, t := range m.trailers {
		if m.bad != nil {
			return
		}
		reason := ""
		if t.total {
			reason = m.checkTotal(t.number)
		} else if n, err := strconv.Atoi(string(t.number)); err != nil || n < 0 {
			reason = "the control total of rows is no whole number"
		} else if n != m.records {
			reason = fmt.Sprintf("the control total says %s, the file has %d; ask the provider to send it whole", rules.Counted(n, "row"), m.records)
		}
		if reason != "" {
			m.bad = &fault{line: t.line, cell: string(t.number), reason: reason}
		}
	}
}

// checkTotal compares the sum of all values, exactly. Where a row is repeated or left out, the sender's sum cannot be known.
func (m *merger) checkTotal(text []byte) string {
	v, dec, why := m.exact(text)
	if why != numberGood && why != numberNotAbove {
		return "the control total of the values is no number"
	}
	if m.repeated > 0 || m.skipped > 0 {
		return ""
	}
	want := scaleUp(big.NewInt(v), m.places-int(dec))
	if got := m.sum(); got.Cmp(want) != 0 {
		return "the sum of the values is not the control total; ask the provider to send the file whole"
	}
	return ""
}

// sum is the exact sum of all values, at the full places.
func (m *merger) sum() *big.Int {
	sum := new(big.Int)
	for _, c := range m.columns() {
		if c.V32 == nil {
			for _, v := range c.V64 {
				if v != watcher.Missing64 {
					sum.Add(sum, scaleUp(big.NewInt(v), m.places-int(c.Decimals)))
				}
			}
			continue
		}
		part := int64(0) // of at most watcher.BlockSize values of 32 bits
		for _, v := range c.V32 {
			if v != watcher.Missing32 {
				part += int64(v)
			}
		}
		sum.Add(sum, scaleUp(big.NewInt(part), m.places-int(c.Decimals)))
	}
	return sum
}

func scaleUp(v *big.Int, places int) *big.Int {
	return v.Mul(v, new(big.Int).SetUint64(rules.Pow10(places)))
}
