package feed

import (
	"encoding/csv"
	"fmt"
	"math/big"
	"slices"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// slowCell is an observation as the slow reader sees it.
type slowCell struct {
	date   string
	series string
	units  *big.Int
	line   int
}

// slowRead reads the plain subset of a long file another way: encoding/csv for the cells, math/big for the values, package time
// for the dates. ok is false when the file is not of the subset or is bad.
func slowRead(text string, f rules.Feed) (cells []slowCell, ok bool) {
	r := csv.NewReader(strings.NewReader(text))
	r.Comma = rune(f.Separator)
	head, err := r.Read()
	if err != nil {
		return nil, false
	}
	at := [3]int{slices.Index(head, "date"), slices.Index(head, "series"), slices.Index(head, "return")}
	if slices.Min(at[:]) < 0 {
		return nil, false
	}
	held := map[string]slowCell{}
	for {
		row, err := r.Read()
		if err != nil {
			return cells, row == nil && err.Error() == "EOF"
		}
		line, _ := r.FieldPos(0)
		c, missing, ok := slowRow(row[at[0]], row[at[1]], row[at[2]], f)
		if !ok {
			return nil, false
		}
		if c.line = line; missing {
			continue
		}
		key := c.date + "\x00" + c.series
		if old, twice := held[key]; !twice {
			held[key] = c
			cells = append(cells, c)
		} else if old.units.Cmp(c.units) != 0 {
			return nil, false
		}
	}
}

func slowRow(date, series, value string, f rules.Feed) (c slowCell, missing, ok bool) {
	value = strings.Trim(value, " \t")
	c.series = strings.Trim(series, " \t")
	d, err := time.Parse("2006-01-02", strings.Trim(date, " \t"))
	if err != nil || d.Year() < 1900 || d.After(testNow.AddDate(0, 0, 1)) || c.series == "" {
		return c, false, false
	}
	c.date = d.Format("2006-01-02")
	if slices.Contains(f.Missing, value) {
		return c, true, true
	}
	c.units, ok = slowUnits(value, f.Decimal, f.Unit.Decimals(), rules.Places)
	return c, false, ok
}

// slowUnits is the value in whole units, rounded half to even, by exact rationals.
func slowUnits(s string, mark byte, shift, places int) (*big.Int, bool) {
	if !plainNumber(s, mark) {
		return nil, false
	}
	v, ok := new(big.Rat).SetString(strings.Replace(s, string(rune(mark)), ".", 1))
	if !ok {
		return nil, false
	}
	v.Mul(v, power(places-shift))
	q, r := new(big.Int).QuoRem(v.Num(), v.Denom(), new(big.Int))
	twice := new(big.Int).Abs(r)
	twice.Lsh(twice, 1)
	if half := twice.Cmp(v.Denom()); half > 0 || half == 0 && q.Bit(0) == 1 {
		q.Add(q, big.NewInt(int64(v.Sign())))
	}
	most := new(big.Int).SetUint64(1<<63 - 1)
	return q, new(big.Int).Abs(q).Cmp(most) <= 0
}

func power(n int) *big.Rat {
	p := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(n)), nil)
	return new(big.Rat).SetInt(p)
}

// plainNumber checks the grammar a state at a time: sign, digits, mark, digits, e, sign, one to four digits.
func plainNumber(s string, mark byte) bool {
	state, exp := "start", 0
	for i := range len(s) {
		digit := s[i] >= '0' && s[i] <= '9'
		sign := s[i] == '+' || s[i] == '-'
		switch {
		case digit && (state == "start" || state == "sign" || state == "whole"):
			state = "whole"
		case digit && (state == "mark" || state == "frac"):
			state = "frac"
		case digit && (state == "e" || state == "esign" || state == "exp"):
			state = "exp"
			exp++
		case sign && state == "start":
			state = "sign"
		case sign && state == "e":
			state = "esign"
		case s[i] == mark && state == "whole":
			state = "mark"
		case (s[i] == 'e' || s[i] == 'E') && (state == "whole" || state == "frac"):
			state = "e"
		default:
			return false
		}
	}
	return state == "whole" || state == "frac" || state == "exp" && exp <= 4
}

// spellSlow writes the slow reader's cells as spell writes a sheet.
func spellSlow(cells []slowCell, names *watcher.Names) string {
	type numbered struct {
		slowCell
		id uint32
	}
	var all []numbered
	for _, c := range cells {
		id, _ := names.Find([]byte(c.series))
		all = append(all, numbered{c, id})
	}
	slices.SortFunc(all, func(a, b numbered) int {
		if a.date != b.date {
			return strings.Compare(a.date, b.date)
		}
		return int(a.id) - int(b.id)
	})
	var b strings.Builder
	for _, c := range all {
		fmt.Fprintf(&b, "%s %s %s %d\n", c.date, c.series, rules.Units(c.units.Int64()), c.line)
	}
	return b.String()
}
