package rules

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"
)

// Units is an exact return as a fixed-point integer: 1e-15 of a fraction a unit, so a return of 1 % is 1e13.
type Units int64

const (
	// Places is how many decimals of a fraction a unit stands for.
	Places = 15
	// One is a return of 1 (100 %).
	One Units = 1e15
	// WindowLimit is the largest size a return may have and still enter a window: +-100 (10,000 %).
	WindowLimit = 100 * One
	// Missing stands in a row of units where there is no value.
	Missing Units = math.MinInt64
)

// Float is the return as a binary64 fraction, rounded once.
func (u Units) Float() float64 { return float64(u) / 1e15 }

// String is the exact decimal, without trailing zeros.
func (u Units) String() string {
	if u == Missing {
		return ""
	}
	return Decimal(int64(u), Places)
}

// Decimal writes v x 10^-places exactly, without trailing zeros.
func Decimal(v int64, places int) string {
	var sign string
	m := uint64(v)
	if v < 0 {
		sign, m = "-", -m
	}
	digits := strconv.FormatUint(m, 10)
	if pad := places + 1 - len(digits); pad > 0 {
		digits = strings.Repeat("0", pad) + digits
	}
	whole, frac := digits[:len(digits)-places], strings.TrimRight(digits[len(digits)-places:], "0")
	if frac == "" {
		return sign + whole
	}
	return sign + whole + "." + frac
}

// Price is an exact price as a fixed-point integer, 1e-10 a unit: prices up to 922,337,203 with ten decimals.
type Price int64

// PricePlaces is how many decimals a unit of Price stands for.
const PricePlaces = 10

// String is the exact decimal, without trailing zeros.
func (p Price) String() string { return Decimal(int64(p), PricePlaces) }

var (
	// ErrNotNumber: the text is no plain or exponent decimal.
	ErrNotNumber = errors.New("not a number")
	// ErrTooLarge: the value does not fit the fixed-point range.
	ErrTooLarge = errors.New("too large")
)

var pow10 = func() (p [20]uint64) {
	p[0] = 1
	for i := 1; i < len(p); i++ {
		p[i] = p[i-1] * 10
	}
	return p
}()

// Pow10 is 10^n for n from 0 to 19.
func Pow10(n int) uint64 { return pow10[n] }

// ParseUnits reads an exact return from a plain or exponent decimal with "." as its point, optionally followed by "%" or
// "bp": "0.0123", "1.23%", "-50 %", "12.5bp". Decimals beyond the fifteenth of the fraction are rounded half to even.
// Errors: ErrNotNumber, ErrTooLarge, both wrapped with the text.
func ParseUnits(s string) (Units, error) {
	body, shift := strings.TrimSpace(s), 0
	if rest, ok := strings.CutSuffix(body, "%"); ok {
		body, shift = strings.TrimSpace(rest), 2
	} else if rest, ok := strings.CutSuffix(body, "bp"); ok {
		body, shift = strings.TrimSpace(rest), 4
	}
	neg, digits, decimals, err := splitDecimal(body)
	if err != nil {
		return 0, fmt.Errorf("%q: %w", s, err)
	}
	v, ok := roundAt(digits, len(digits)+Places-decimals-shift)
	if !ok {
		return 0, fmt.Errorf("%q: %w", s, ErrTooLarge)
	}
	if neg {
		v = -v
	}
	return Units(v), nil
}

// roundAt keeps so many of the digits, zeros added where they are fewer, and rounds half to even by the rest. digits has no leading
// zero. ok is false when the result does not fit in 63 bits.
func roundAt(digits string, keep int) (v int64, ok bool) {
	switch {
	case keep < 0 || digits == "":
		return 0, true
	case keep > 19:
		return 0, false
	case keep > len(digits):
		digits += strings.Repeat("0", keep-len(digits))
	}
	m, rest := uint64(0), digits[keep:]
	for _, c := range []byte(digits[:keep]) {
		m = m*10 + uint64(c-'0') // at most 19 digits fit in 64 bits
	}
	if rest != "" && (rest[0] > '5' || rest[0] == '5' && (m&1 == 1 || strings.Trim(rest[1:], "0") != "")) {
		m++
	}
	return int64(m), m <= math.MaxInt64
}

// splitDecimal takes a plain or exponent decimal ("-12.34", "1.5e-3") apart: its value is digits x 10^-decimals. digits has no leading
// zero and is "" for zero.
func splitDecimal(s string) (neg bool, digits string, decimals int, err error) {
	body := s
	if len(body) > 0 && (body[0] == '-' || body[0] == '+') {
		neg = body[0] == '-'
		body = body[1:]
	}
	body, exp, err := cutExponent(body)
	if err != nil {
		return false, "", 0, err
	}
	whole, frac, point := strings.Cut(body, ".")
	if whole == "" || point && frac == "" || strings.Trim(whole+frac, "0123456789") != "" {
		return false, "", 0, ErrNotNumber
	}
	return neg, strings.TrimLeft(whole+frac, "0"), len(frac) - exp, nil
}

func cutExponent(s string) (body string, exp int, err error) {
	i := strings.IndexAny(s, "eE")
	if i < 0 {
		return s, 0, nil
	}
	text := s[i+1:]
	if n := len(strings.TrimLeft(text, "+-")); n == 0 || n > 4 || len(text)-n > 1 {
		return "", 0, ErrNotNumber
	}
	exp, err = strconv.Atoi(text)
	if err != nil {
		return "", 0, ErrNotNumber
	}
	return s[:i], exp, nil
}

// unitsUp and unitsDown turn a line into whole units, rounding up and down. Lines beyond the window limit are held to it.
func unitsUp(f float64) Units   { return clampUnits(math.Ceil(f * 1e15)) }
func unitsDown(f float64) Units { return clampUnits(math.Floor(f * 1e15)) }

func clampUnits(f float64) Units {
	limit := float64(WindowLimit)
	return Units(min(max(f, -limit), limit))
}
