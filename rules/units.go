package rules

import (
	"errors"
	"fmt"
	"math"
	"math/bits"
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

// Fixed turns mantissa x 10^-decimals into an integer at the given number of places, rounding half to even.
// decimals may be negative. ErrTooLarge is returned when the result does not fit in 63 bits.
func Fixed(mantissa int64, decimals, places int) (int64, error) {
	shift := places - decimals
	if mantissa == 0 {
		return 0, nil
	}
	neg := mantissa < 0
	m := uint64(mantissa)
	if neg {
		m = -m
	}
	switch {
	case shift > 18:
		return 0, ErrTooLarge
	case shift >= 0:
		hi, lo := bits.Mul64(m, pow10[shift])
		if hi != 0 || lo > math.MaxInt64 {
			return 0, ErrTooLarge
		}
		m = lo
	case shift < -19:
		m = 0
	default:
		m = divHalfEven(m, pow10[-shift])
	}
	if m > math.MaxInt64 {
		return 0, ErrTooLarge
	}
	if neg {
		return -int64(m), nil
	}
	return int64(m), nil
}

func divHalfEven(m, d uint64) uint64 {
	q, r := m/d, m%d
	half := d / 2 // every divisor is a power of ten, so even (or 1, with no remainder)
	if r > half || r == half && d > 1 && q&1 == 1 {
		q++
	}
	return q
}

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
	mantissa, decimals, err := ParseDecimal(body)
	if err != nil {
		return 0, fmt.Errorf("%q: %w", s, err)
	}
	v, err := Fixed(mantissa, decimals+shift, Places)
	if err != nil || Units(v) == Missing {
		return 0, fmt.Errorf("%q: %w", s, ErrTooLarge)
	}
	return Units(v), nil
}

// ParseDecimal splits a plain or exponent decimal ("-12.34", "1.5e-3") into an integer mantissa and its number of decimals.
// Digits beyond the eighteenth significant one are cut, leaving a trace in the last kept digit, so that rounding the result
// once more (Fixed) is correct to the last place.
func ParseDecimal(s string) (mantissa int64, decimals int, err error) {
	body, neg := s, false
	if len(body) > 0 && (body[0] == '-' || body[0] == '+') {
		neg = body[0] == '-'
		body = body[1:]
	}
	body, exp, err := cutExponent(body)
	if err != nil {
		return 0, 0, err
	}
	m, decimals, err := digits(body)
	if err != nil {
		return 0, 0, err
	}
	if neg {
		m = -m
	}
	return m, decimals - exp, nil
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

// digits reads digits with at most one point and at least one digit on each side that is there.
func digits(s string) (m int64, decimals int, err error) {
	whole, frac, point := strings.Cut(s, ".")
	if whole == "" || point && frac == "" {
		return 0, 0, ErrNotNumber
	}
	text := whole + frac
	for i := range len(text) {
		if text[i] < '0' || text[i] > '9' {
			return 0, 0, ErrNotNumber
		}
	}
	decimals = len(frac)
	text = strings.TrimLeft(text, "0")
	if len(text) <= 18 {
		if text == "" {
			return 0, 0, nil
		}
		m, err = strconv.ParseInt(text, 10, 64)
		return m, decimals, err
	}
	m, _ = strconv.ParseInt(text[:18], 10, 64)
	decimals -= len(text) - 18
	if strings.Trim(text[18:], "0") != "" && m%5 == 0 {
		m++ // a trace of what was cut, so that rounding at a coarser place still sees which side of the half it lies on
	}
	return m, decimals, nil
}

// unitsUp and unitsDown turn a line into whole units, rounding up and down. Lines beyond the window limit are held to it.
func unitsUp(f float64) Units   { return clampUnits(math.Ceil(f * 1e15)) }
func unitsDown(f float64) Units { return clampUnits(math.Floor(f * 1e15)) }

func clampUnits(f float64) Units {
	limit := float64(WindowLimit)
	return Units(min(max(f, -limit), limit))
}
