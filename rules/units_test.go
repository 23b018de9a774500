package rules_test

import (
	"errors"
	"math"
	"math/big"
	"strings"
	"testing"

	"strayd/rules"
)

// exactly is a decimal text with an optional unit as a whole number of units, rounded half to even; ok is false when it does not fit.
func exactly(text string) (u rules.Units, ok bool) {
	text = strings.TrimSpace(text)
	divisor := int64(1)
	if rest, is := strings.CutSuffix(text, "%"); is {
		text, divisor = rest, 100
	} else if rest, is := strings.CutSuffix(text, "bp"); is {
		text, divisor = rest, 10000
	}
	r, is := new(big.Rat).SetString(strings.TrimSpace(text))
	if !is {
		panic("the test's text is no number: " + text)
	}
	r.Mul(r, new(big.Rat).SetFrac64(1e15, divisor))
	n := halfEven(r)
	return rules.Units(n.Int64()), n.IsInt64() && n.Int64() != math.MinInt64
}

// halfEven rounds a rational to a whole number.
func halfEven(r *big.Rat) *big.Int {
	q, m := new(big.Int).DivMod(r.Num(), r.Denom(), new(big.Int)) // m >= 0
	switch c := m.Lsh(m, 1).Cmp(r.Denom()); {
	case c > 0, c == 0 && q.Bit(0) == 1:
		q.Add(q, big.NewInt(1))
	}
	return q
}

func TestParseUnits(t *testing.T) {
	for _, text := range []string{
		"0", "-0", "+0", "1", "-1", "0.01", "1%", "-50 %", "12.5bp", "12.5 bp", " 3% ", "1e2", "1E-2", "+1e+2%", "1.5e-3", "0.000000000000001",
		// half a unit goes to the even one
		"0.0000000000000005", "0.0000000000000015", "0.0000000000000025", "-0.0000000000000005", "-0.0000000000000015",
		"0.00000000000000050000000000000000000000001", "0.00000000000000049999999999999999999999999", "0.0000000000000015000000000000000000001",
		// the trace of what is cut beyond the eighteenth digit
		"1234.567890123456785", "1234.5678901234567850000000000000000001", "1234.5678901234567849999999999999999999",
		"0.1234567890123455", "0.12345678901234550000000000000000001", "0.1234567890123445", "0.12345678901234449999999999999999999999",
		"123456789012345678e-18", "1234567890123456785e-19", "12345678901234567850001e-23",
		// the edges of what fits
		"9223.372036854775807", "-9223.372036854775807", "9223.3720368547758074", "9223.3720368547758075", "9223.372036854775808", "-9223.372036854775808",
		"922337.2036854775807%", "922337.2036854775808%", "10000", "1e9999", "1e-9999", "-1e-9999", "99999999999999999999999999", "0e9999", "0.0000e9999",
	} {
		want, ok := exactly(text)
		got, err := rules.ParseUnits(text)
		switch {
		case ok && (got != want || err != nil):
			t.Errorf("%q is %d, %v, want %d", text, got, err, want)
		case !ok && !errors.Is(err, rules.ErrTooLarge):
			t.Errorf("%q is %d, %v, want it too large", text, got, err)
		}
	}
}

func TestParseUnitsRefuses(t *testing.T) {
	for _, text := range []string{"", " ", "%", "bp", "-", "+", ".", "1.", ".5", "-.5", "1..2", "1.2.3", "--1", "+-1", "1e", "e5", "1e+", "1e--5", "1e5.5",
		"1e99999", "0x10", "1_000", "1,5", "1 000", "NaN", "inf", "-Inf", "Infinity", "1%%", "1%bp", "1 % %", "１", "1‰", "−1", "1e5e5", "1d5", "0b1", "1/2"} {
		if got, err := rules.ParseUnits(text); !errors.Is(err, rules.ErrNotNumber) {
			t.Errorf("%q is %d, %v, want no number", text, got, err)
		} else if !strings.Contains(err.Error(), text) {
			t.Errorf("the error for %q is %q, without its text", text, err)
		}
	}
}

// Whatever is read is what the rationals say, and what is written reads back as the same.
func FuzzParseUnits(f *testing.F) {
	for _, s := range []string{"0.1", "-1.25%", "3bp", "1e-3", "9223.3720368547758075", "0.0000000000000015", "12345678901234567890e-20"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		got, err := rules.ParseUnits(text)
		if errors.Is(err, rules.ErrNotNumber) || len(text) > 200 {
			return
		}
		want, ok := exactly(text)
		if ok != (err == nil) || ok && got != want {
			t.Fatalf("%q is %d, %v, want %d, %v", text, got, err, want, ok)
		}
		if err != nil {
			return
		}
		if back, err := rules.ParseUnits(got.String()); back != got || err != nil {
			t.Fatalf("%d is written %s, which reads as %d, %v", got, got, back, err)
		}
	})
}

func TestUnitsString(t *testing.T) {
	for u, want := range map[rules.Units]string{
		0: "0", 1: "0.000000000000001", -1: "-0.000000000000001", rules.One: "1", -rules.One: "-1", rules.One / 2: "0.5", 12345 * 1e10: "0.12345",
		rules.WindowLimit: "100", math.MaxInt64: "9223.372036854775807", -math.MaxInt64: "-9223.372036854775807", rules.Missing: "",
		rules.One + 1: "1.000000000000001", 10 * rules.One: "10",
	} {
		if got := u.String(); got != want {
			t.Errorf("%d is written %q, want %q", int64(u), got, want)
		}
	}
	for p, want := range map[rules.Price]string{0: "0", 1: "0.0000000001", 1e10: "1", 12345e8: "123.45", math.MaxInt64: "922337203.6854775807"} {
		if got := p.String(); got != want {
			t.Errorf("price %d is written %q, want %q", int64(p), got, want)
		}
	}
	if got := rules.Decimal(math.MinInt64, 15); got != "-9223.372036854775808" {
		t.Errorf("the smallest is written %q", got)
	}
	if got := rules.Decimal(120, 0); got != "120" {
		t.Errorf("120 without places is written %q", got)
	}
}

// A return as a float is the decimal rounded once.
func TestUnitsFloat(t *testing.T) {
	for _, u := range []rules.Units{0, 1, -1, 3, 1e13, 123456789012345, 1234567890123456, 99999999999999999, 100000000000000001, math.MaxInt64, -math.MaxInt64} {
		want, _ := new(big.Rat).SetFrac64(int64(u), 1e15).Float64()
		// Above 2^53 the integer is rounded before the division, so that the last place may differ.
		if got := u.Float(); math.Abs(got-want) > math.Abs(want)*0x1p-52 || math.Abs(float64(u)) < 1<<53 && got != want {
			t.Errorf("%d is %v, want %v", int64(u), got, want)
		}
	}
}
