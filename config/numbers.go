package config

import (
	"errors"
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"
	"time"

	"gopkg.in/yaml.v3"

	"strayd/rules"
)

// bounds are the least and greatest value; an open end is not itself allowed.
type bounds struct {
	low, high         float64
	openLow, openHigh bool
}

func (b bounds) hold(v float64) bool {
	return v >= b.low && v <= b.high && !(b.openLow && v == b.low) && !(b.openHigh && v == b.high)
}

func (b bounds) words(write func(float64) string) string {
	low, high := "from ", " to "
	if b.openLow {
		low = "more than "
	}
	if b.openLow || b.openHigh {
		high = " and at most "
	}
	if b.openHigh {
		high = " and less than "
	}
	return low + write(b.low) + high + write(b.high)
}

func (b bounds) json(kind string) map[string]any {
	low, high := "minimum", "maximum"
	if b.openLow {
		low = "exclusiveMinimum"
	}
	if b.openHigh {
		high = "exclusiveMaximum"
	}
	return map[string]any{"type": kind, low: b.low, high: b.high}
}

func plain(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

func percent(v float64) string { return strconv.FormatFloat(v*100, 'g', 12, 64) + "%" }

// quoted says whether a scalar stands in quotes or in a block.
func quoted(n *yaml.Node) bool {
	return n.Style&(yaml.DoubleQuotedStyle|yaml.SingleQuotedStyle|yaml.LiteralStyle|yaml.FoldedStyle) != 0
}

var (
	wholeNumber = regexp.MustCompile(`^-?(0|[1-9][0-9]*)$`)
	anyNumber   = regexp.MustCompile(`^-?(0|[1-9][0-9]*)(\.[0-9]+)?([eE][+-]?[0-9]+)?$`)
)

// notFinite are the numbers of YAML that are none here.
var notFinite = regexp.MustCompile(`(?i)^[+-]?\.(inf|nan)$`)

// integer is a whole number in plain digits.
func integer(low, high int) shape {
	b := bounds{low: float64(low), high: float64(high)}
	return scalar[int]{what: "a whole number " + b.words(plain), json: b.json("integer"),
		parse: func(_ *decoder, n *yaml.Node) (int, error) {
			if quoted(n) {
				return 0, errors.New("a number in quotes")
			}
			v, err := strconv.Atoi(n.Value)
			if err != nil && errors.Is(err, strconv.ErrRange) || err == nil && !b.hold(float64(v)) {
				return 0, errors.New("out of bounds")
			}
			if err != nil || !wholeNumber.MatchString(n.Value) {
				return 0, errors.New("not a whole number in plain digits")
			}
			return v, nil
		}}
}

// number is a finite decimal number.
func number(b bounds) shape {
	return scalar[float64]{what: "a number " + b.words(plain), json: b.json("number"),
		parse: func(_ *decoder, n *yaml.Node) (float64, error) {
			if quoted(n) {
				return 0, errors.New("a number in quotes")
			}
			return bounded(n.Value, "", b)
		}}
}

// bounded reads a decimal whose point moves as the exponent says ("e-2" for percent).
func bounded(text, exponent string, b bounds) (float64, error) {
	if notFinite.MatchString(text) {
		return 0, errors.New("not a finite number")
	}
	if !anyNumber.MatchString(text) {
		return 0, errors.New("not a number in plain decimal digits")
	}
	v, err := strconv.ParseFloat(text+exponent, 64)
	if err != nil || math.IsInf(v, 0) || !b.hold(v) {
		return 0, errors.New("out of bounds")
	}
	return v, nil
}

const sharePattern = `^-?(0|[1-9][0-9]*)(\.[0-9]+)? ?(%|bp)$`

var withUnit = regexp.MustCompile(sharePattern)

// cutUnit splits "0.27%" into its digits and the exponent of its unit. Without a unit the value is a fraction, and a number.
func cutUnit(n *yaml.Node) (digits, exponent string, err error) {
	switch {
	case withUnit.MatchString(n.Value) && strings.HasSuffix(n.Value, "%"):
		return strings.TrimRight(n.Value, " %"), "e-2", nil
	case withUnit.MatchString(n.Value):
		return strings.TrimRight(n.Value, " bp"), "e-4", nil
	case quoted(n) && anyNumber.MatchString(n.Value):
		return "", "", errors.New("a number in quotes")
	}
	return n.Value, "", nil
}

// share is a fraction, written as one or in percent or basis points.
func share(b bounds) shape {
	return scalar[float64]{what: "a share " + b.words(percent) + ", such as 1%, 25bp or 0.01",
		json: map[string]any{"anyOf": []any{map[string]any{"type": "string", "pattern": sharePattern}, b.json("number")}},
		parse: func(_ *decoder, n *yaml.Node) (float64, error) {
			digits, exponent, err := cutUnit(n)
			if err != nil {
				return 0, err
			}
			return bounded(digits, exponent, b)
		}}
}

// exactReturn is a return kept to the last of its fifteen decimals.
func exactReturn() shape {
	return scalar[rules.Units]{what: "a return such as -50%, 250bp or 0.5",
		json: map[string]any{"anyOf": []any{map[string]any{"type": "string", "pattern": sharePattern}, map[string]any{"type": "number"}}},
		parse: func(_ *decoder, n *yaml.Node) (rules.Units, error) {
			digits, _, err := cutUnit(n)
			switch {
			case err != nil:
				return 0, err
			case notFinite.MatchString(digits):
				return 0, errors.New("not a finite number")
			case !anyNumber.MatchString(digits):
				return 0, errors.New("not a number in plain decimal digits")
			}
			u, err := rules.ParseUnits(n.Value)
			if err != nil {
				return 0, errors.New("out of bounds")
			}
			return u, nil
		}}
}

const durationPattern = `^([0-9]+(\.[0-9]+)?(s|m|h))+$`

var durationText = regexp.MustCompile(durationPattern)

// duration is a length of time with its unit.
func duration(low, high time.Duration) shape {
	return scalar[time.Duration]{what: fmt.Sprintf("a duration with its unit, such as 90s, 15m or 2h, from %s to %s", short(low), short(high)),
		json: map[string]any{"type": "string", "pattern": durationPattern},
		parse: func(_ *decoder, n *yaml.Node) (time.Duration, error) {
			if anyNumber.MatchString(n.Value) {
				return 0, errors.New("a duration without its unit")
			}
			v, err := time.ParseDuration(n.Value)
			switch {
			case err != nil || !durationText.MatchString(n.Value):
				return 0, errors.New("not a duration")
			case v < low || v > high:
				return 0, errors.New("out of bounds")
			}
			return v, nil
		}}
}

// short writes a duration without the units that are zero.
func short(d time.Duration) string {
	s := d.String()
	if strings.HasSuffix(s, "m0s") {
		s = strings.TrimSuffix(s, "0s")
	}
	if strings.HasSuffix(s, "h0m") {
		s = strings.TrimSuffix(s, "0m")
	}
	return s
}

// yes is a boolean, written true or false and in no other way.
func yes() shape {
	return scalar[bool]{what: "true or false", json: map[string]any{"type": "boolean"},
		parse: func(_ *decoder, n *yaml.Node) (bool, error) {
			if quoted(n) || n.Value != "true" && n.Value != "false" {
				return false, errors.New("not a boolean")
			}
			return n.Value == "true", nil
		}}
}
