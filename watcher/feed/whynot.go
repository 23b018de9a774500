package feed

import (
	"bytes"
	"fmt"
	"strings"
	"unicode/utf8"
)

// whyNot says what a refused value looks like, and the cure.
func (p *plan) whyNot(cell []byte, why numberFault) string {
	switch why {
	case numberLarge:
		if p.price {
			return "the price does not fit: it must lie below 922,337,203.6854775807"
		}
		return "the return does not fit: as a fraction it must lie within +-9223.372036854775807"
	case numberNotAbove:
		return "a price must be above zero"
	}
	return p.notNumber(string(cell))
}

// notNumber names the spelling by its first tell-tale.
func (p *plan) notNumber(s string) string {
	lower := strings.ToLower(strings.TrimLeft(s, "+-"))
	switch {
	case s == "":
		return `the value is empty; if that means no value, "" belongs in the feed's missing tokens`
	case lower == "nan" || lower == "inf" || lower == "infinity":
		return "the value is not finite"
	case s[0] == '#':
		return "the value is a spreadsheet's error"
	case strings.HasPrefix(lower, "0x"):
		return "the value is a hexadecimal number; deliver decimals"
	case strings.ContainsRune(s, '\u2212') || strings.ContainsRune(s, '\u2013'):
		return "the minus is a typographic one (U+2212 or a dash); deliver an ASCII hyphen-minus"
	case strings.ContainsAny(s, "()"):
		return "the value is in parentheses; deliver a minus sign"
	case strings.ContainsAny(s, "%"):
		if p.asGrid {
			return "the cell is shown as per cent: a number so shown holds the fraction, declare unit: fraction; a text, deliver the bare number"
		}
		return "the value carries a percent sign; deliver the bare number and declare unit: percent"
	case strings.HasSuffix(lower, "bp"):
		return "the value carries its unit; deliver the bare number and declare unit: bp"
	}
	return p.notPlain(s)
}

func (p *plan) notPlain(s string) string {
	other := byte(',')
	if p.mark == ',' {
		other = '.'
	}
	digits := bytes.ContainsAny([]byte(s), "0123456789")
	switch {
	case !digits:
		return "the value is not a number"
	case strings.ContainsAny(s, "_' \u00a0\u2009\u202f\u2019"):
		return "the digits are grouped; deliver them without thousands separators"
	case strings.IndexByte(s, other) >= 0 && strings.IndexByte(s, p.mark) >= 0,
		strings.Count(s, string(rune(other))) > 1:
		return "the value has a thousands separator; deliver the digits ungrouped"
	case strings.IndexByte(s, other) >= 0:
		return fmt.Sprintf("the value has %q where the feed declares decimal: %q", other, string(rune(p.mark)))
	case s[len(s)-1] == p.mark || strings.TrimLeft(s, "+-")[0] == p.mark:
		return "the value needs a digit on both sides of its decimal mark"
	case strings.Count(s, string(rune(p.mark))) > 1:
		return "the value has more than one decimal mark"
	case !utf8.ValidString(s):
		return "the value is not valid UTF-8"
	}
	return "the value is not a number"
}
