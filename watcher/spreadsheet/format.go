package spreadsheet

import (
	"strings"

	"strayd/watcher"
)

// format says what a number of a style is: a day, a per cent, or just a number.
func (g *grid) format(style int) (watcher.CellKind, error) {
	s, err := g.book.GetStyle(style)
	if err != nil {
		return 0, err
	}
	if s.CustomNumFmt != nil {
		return ofCode(*s.CustomNumFmt), nil
	}
	switch n := s.NumFmt; {
	case n == 9 || n == 10: // 0% and 0.00% (ECMA-376, part 1, 18.8.30)
		return watcher.PercentCell, nil
	case n >= 14 && n <= 22, n >= 27 && n <= 36, n >= 45 && n <= 47, n >= 50 && n <= 58: // dates and times, also those of East Asia
		return watcher.DateCell, nil
	}
	return watcher.NumberCell, nil
}

// ofCode reads the first part of a code such as dd/mm/yyyy or 0.00%, without what is quoted, escaped or in brackets.
func ofCode(code string) watcher.CellKind {
	code = strings.ToLower(code)
	var bare strings.Builder
	for i := 0; i < len(code) && code[i] != ';'; i++ {
		switch code[i] {
		case '\\', '_', '*':
			i++
		case '"', '[':
			closing := map[byte]byte{'"': '"', '[': ']'}[code[i]]
			if end := strings.IndexByte(code[i+1:], closing); end >= 0 {
				i += end + 1
			}
		default:
			bare.WriteByte(code[i])
		}
	}
	text := strings.ReplaceAll(bare.String(), "general", "")
	switch {
	case strings.Contains(text, "%"):
		return watcher.PercentCell
	case strings.ContainsAny(text, "ydmhs"):
		return watcher.DateCell
	}
	return watcher.NumberCell
}
