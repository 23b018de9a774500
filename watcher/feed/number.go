package feed

import (
	"bytes"
	"math"
	"math/bits"
	"strconv"

	"strayd/rules"
)

// amount says how the text of a value becomes an exact integer at a fixed number of places.
//
//	value = digits x 10^(exponent - decimals - shift), rounded half to even at places
type amount struct {
	mark   byte // the decimal mark
	shift  int  // how far the unit moves the point: 2 for percent
	places int  // of the integer: rules.Places or rules.PricePlaces
	price  bool // must be above zero
}

// fault of a number, none when empty.
type numberFault uint8

const (
	numberGood numberFault = iota
	numberBad
	numberLarge
	numberNotAbove
)

// longestExponent is how many digits an exponent may have.
const longestExponent = 4

// exact reads a whole cell: an optional sign, digits, optionally the decimal mark and digits, optionally an exponent. The
// value is v x 10^-dec with 0 <= dec <= places, without trailing zeros; at the full places it fits an int64.
func (a *amount) exact(cell []byte) (v int64, dec uint8, why numberFault) {
	neg, whole, frac, exp, ok := a.split(cell)
	if !ok {
		return 0, 0, numberBad
	}
	var room [48]byte
	digits := append(append(room[:0], whole...), frac...)
	decimals := len(frac) + a.shift - exp
	digits, decimals = strip(digits, decimals)
	m, decimals, ok := fix(digits, decimals, a.places)
	if !ok {
		return 0, 0, numberLarge
	}
	if a.price && (neg || m == 0) {
		return 0, 0, numberNotAbove
	}
	if neg {
		return -int64(m), uint8(decimals), numberGood
	}
	return int64(m), uint8(decimals), numberGood
}

// split takes a number apart by the grammar.
func (a *amount) split(s []byte) (neg bool, whole, frac []byte, exp int, ok bool) {
	if len(s) > 0 && (s[0] == '-' || s[0] == '+') {
		neg, s = s[0] == '-', s[1:]
	}
	n := digitsAt(s)
	whole, s = s[:n], s[n:]
	if n == 0 {
		return neg, nil, nil, 0, false
	}
	if len(s) > 0 && s[0] == a.mark {
		n = digitsAt(s[1:])
		frac, s = s[1:1+n], s[1+n:]
		if n == 0 {
			return neg, nil, nil, 0, false
		}
	}
	exp, ok = exponent(s)
	return neg, whole, frac, exp, ok
}

func digitsAt(s []byte) int {
	n := 0
	for n < len(s) && s[n]-'0' <= 9 {
		n++
	}
	return n
}

// exponent reads what follows the digits: nothing, or e or E, an optional sign and up to longestExponent digits.
func exponent(s []byte) (int, bool) {
	if len(s) == 0 {
		return 0, true
	}
	if s[0] != 'e' && s[0] != 'E' {
		return 0, false
	}
	digits := bytes.TrimPrefix(s[1:], []byte("+"))
	if len(digits) == len(s)-1 {
		digits = bytes.TrimPrefix(digits, []byte("-"))
	}
	if n := digitsAt(digits); n == 0 || n != len(digits) || n > longestExponent {
		return 0, false
	}
	exp, err := strconv.Atoi(string(s[1:]))
	return exp, err == nil
}

// strip takes the zeros off both ends; zero becomes no digits at all.
func strip(digits []byte, decimals int) ([]byte, int) {
	digits = bytes.TrimLeft(digits, "0")
	n := len(digits)
	digits = bytes.TrimRight(digits, "0")
	return digits, decimals - (n - len(digits))
}

// fix gives digits x 10^-decimals as m x 10^-dec with 0 <= dec <= places. ok is false when m x 10^(places-dec) does not fit 63
// bits. digits has no zero at either end.
func fix(digits []byte, decimals, places int) (m uint64, dec int, ok bool) {
	if len(digits) == 0 {
		return 0, 0, true
	}
	if decimals > places {
		m, ok = roundAt(digits, len(digits)-(decimals-places))
		return m, places, ok
	}
	if len(digits)+places-decimals > 19 {
		return 0, 0, false
	}
	m = number(digits)
	if decimals < 0 {
		m *= rules.Pow10(-decimals)
		decimals = 0
	}
	hi, full := bits.Mul64(m, rules.Pow10(places-decimals))
	return m, decimals, hi == 0 && full <= math.MaxInt64
}

// roundAt keeps the first digits and rounds half to even by the others, of which the last is not zero.
func roundAt(digits []byte, keep int) (uint64, bool) {
	if keep < 0 {
		return 0, true
	}
	if keep > 19 {
		return 0, false
	}
	m := number(digits[:keep])
	next, more := digits[keep], keep+1 < len(digits)
	if next > '5' || next == '5' && (more || m&1 == 1) {
		m++
	}
	return m, m <= math.MaxInt64
}

// number is the value of up to 19 digits.
func number(digits []byte) uint64 {
	var m uint64
	for _, d := range digits {
		m = m*10 + uint64(d-'0')
	}
	return m
}
