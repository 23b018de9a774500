package rules

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// InPercent writes a return for a person: signed per cent with two decimals, basis points under 0.1 %.
func InPercent(v float64) string {
	if a := math.Abs(v); a != 0 && a < 0.001 {
		return fmt.Sprintf("%+.2f bp", v*1e4)
	}
	return fmt.Sprintf("%+.2f %%", v*100)
}

// Between writes a range with one or both of its lines, and nothing when it has none.
func Between(low, high Num) string {
	switch {
	case low.OK && high.OK:
		return InPercent(low.V) + " to " + InPercent(high.V)
	case low.OK:
		return InPercent(low.V) + " or above"
	case high.OK:
		return InPercent(high.V) + " or below"
	}
	return ""
}

// rarest is the longest waiting time that a person is told: a series' own past supports no rarer one.
const rarest = 5000

// OnceIn writes a tail probability above 0 as a waiting time.
func OnceIn(tail float64) string {
	switch days := 1 / tail; {
	case days >= rarest:
		return "rarer than 1 in " + Thousands(rarest)
	case days < 1.5:
		return "about every day"
	default:
		return "about once in " + Thousands(int(math.Round(days))) + " days"
	}
}

// Thousands writes a count with commas between thousands.
func Thousands(n int) string {
	s := strconv.Itoa(n)
	for i := len(s) - 3; i > 0 && s[i-1] != '-'; i -= 3 {
		s = s[:i] + "," + s[i:]
	}
	return s
}

// Counted writes a count with its noun: "1 row", "2 rows".
func Counted(n int, noun string) string {
	switch {
	case n == 1, noun == "series":
		return Thousands(n) + " " + noun
	case strings.HasSuffix(noun, "ch"), strings.HasSuffix(noun, "ss"):
		return Thousands(n) + " " + noun + "es"
	case strings.HasSuffix(noun, "ry"):
		return Thousands(n) + " " + strings.TrimSuffix(noun, "y") + "ies"
	}
	return Thousands(n) + " " + noun + "s"
}

// Day writes a date with its weekday: "Fri 2026-03-13".
func (d Date) Day() string { return d.Time().Format("Mon 2006-01-02") }

// Odds says natural log odds in words: "18 to 1", "1 to 3"; "over 1,000 to 1" at most.
func Odds(log float64) string {
	ratio := math.Round(math.Exp(min(math.Abs(log), 10)))
	size := Thousands(int(ratio))
	if ratio > 1000 {
		size = "over 1,000"
	}
	if log < 0 {
		return "1 to " + size
	}
	return size + " to 1"
}
