package sample

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"strayd/rules"
)

// usualMissing are the missing tokens of a configuration that names none.
var usualMissing = []string{"", "NA", "n/a"}

// wellKnown are texts that mean no value, wherever they stand.
var wellKnown = []string{"", "na", "n/a", "nan", "null", "none", "nil", "-", "--", ".", "n.a.", "#n/a"}

// values finds the decimal mark, the missing tokens, and what the numbers are: prices, or returns in which unit.
func (f *Finding) values(t *table) {
	f.decimal(t)
	f.missing(t)
	found := t.found(f.Feed.Decimal)
	if f.price(t, found) {
		return
	}
	f.unit(t, found)
}

// decimal: the mark by which more cells are numbers.
func (f *Finding) decimal(t *table) {
	dot, comma := 0, 0
	var example string
	for _, i := range t.value {
		for _, p := range t.columns[i].cells {
			hasDot, hasComma := number(p.cell, '.') && strings.Contains(p.cell, "."), number(p.cell, ',') && strings.Contains(p.cell, ",")
			if hasDot {
				dot++
			}
			if hasComma {
				comma++
			}
			if hasDot && (comma == 0 || dot > comma) || hasComma && comma > dot {
				example = p.cell
			}
		}
	}
	r := Remark{Key: "decimal", Sure: Sure, Why: fmt.Sprintf("as in %q", example)}
	switch f.Feed.Decimal = '.'; {
	case comma > dot:
		f.Feed.Decimal = ','
		if dot > 0 || t.grouped() {
			r.Sure, r.Confirm = Likely, true
			r.Why += ", unless the comma parts thousands"
		}
	case dot == 0:
		r.Sure, r.Why, r.Confirm = Guess, "no number has a decimal mark", !t.samples[0].Typed
	case comma > 0:
		r.Sure, r.Confirm = Likely, true
		r.Why += fmt.Sprintf(", though %s a comma", rules.Counted(comma, "cell")+" with")
	}
	if t.samples[0].Typed {
		r.Sure, r.Confirm = Sure, false
		r.Why = "the cells are numbers; this matters for numbers that are kept as text"
	}
	f.Remarks = append(f.Remarks, r)
}

// grouped says whether every comma has three digits after it and one to three before it, as where it parts thousands.
func (t *table) grouped() bool {
	for _, i := range t.value {
		for _, p := range t.columns[i].cells {
			before, after, has := strings.Cut(strings.TrimLeft(p.cell, "+-"), ",")
			if has && (len(after) != 3 || len(before) > 3 || before == "0") {
				return false
			}
		}
	}
	return true
}

// missing: the texts among the numbers.
func (f *Finding) missing(t *table) {
	f.Feed.Missing = slices.Clone(usualMissing)
	var doubtful []string
	seen := map[string]int{}
	for _, i := range t.value {
		for _, p := range t.columns[i].cells {
			if !number(p.cell, f.Feed.Decimal) {
				seen[p.cell]++
			}
		}
	}
	var texts []string
	for text := range seen {
		texts = append(texts, text)
	}
	slices.Sort(texts)
	var said []string
	for _, text := range texts {
		known := slices.Contains(wellKnown, strings.ToLower(text))
		if strings.ContainsAny(text, "0123456789") {
			continue // a number in a spelling that is refused: reading the file says so
		}
		if !slices.Contains(f.Feed.Missing, text) {
			f.Feed.Missing = append(f.Feed.Missing, text)
		}
		if !known || strings.HasPrefix(text, "#") {
			doubtful = append(doubtful, text)
		}
		said = append(said, fmt.Sprintf("%q %s", text, rules.Counted(seen[text], "time")))
	}
	r := Remark{Key: "missing", Sure: Sure, Why: "every value is a number; these are the usual tokens"}
	if len(said) > 0 {
		r.Why = "among the values stand " + strings.Join(said, ", ")
	}
	if len(doubtful) > 0 {
		r.Sure, r.Confirm = Guess, true
		r.Why += "; do they mean that there is no value?"
	}
	f.Remarks = append(f.Remarks, r)
}

// found are the numbers of the samples, by series in the order of the file.
func (t *table) found(mark byte) map[string][]float64 {
	found := map[string][]float64{}
	for _, i := range t.value {
		c := t.columns[i]
		for n, p := range c.cells {
			v, err := strconv.ParseFloat(strings.Replace(p.cell, string(rune(mark)), ".", 1), 64)
			if err != nil || math.IsNaN(v) || math.IsInf(v, 0) {
				continue
			}
			name := c.name
			if t.series >= 0 && n < len(t.columns[t.series].cells) {
				name = t.columns[t.series].cells[n].cell
			}
			found[name] = append(found[name], v)
		}
	}
	return found
}

// price tells prices from returns: prices are above zero and stay near where they were, returns change their sign.
func (f *Finding) price(t *table, found map[string][]float64) bool {
	above, all, steps := true, []float64{}, []float64{}
	for _, vals := range found {
		for i, v := range vals {
			above = above && v > 0
			all = append(all, v)
			if i > 0 && v > 0 && vals[i-1] > 0 {
				steps = append(steps, math.Abs(v/vals[i-1]-1))
			}
		}
	}
	named := func(words []string) bool {
		return t.series >= 0 && t.columns[t.value[0]].hinted(words...) // the columns of a wide file are named as series are
	}
	byName, byReturn := named(priceWords), named(returnWords)
	r := Remark{Key: "value", Sure: Likely, Confirm: true}
	steady := len(steps) > 0 && median(steps) < 0.1
	switch {
	case !above || byReturn || !byName && (len(steps) < 20 || !steady):
		f.Feed.Value = rules.OfReturn
		r.Sure, r.Confirm, r.Why = Sure, false, "some numbers are below zero, as no price is"
		if above {
			r.Sure, r.Confirm, r.Why = Likely, true, "no number is below zero, but they jump about as prices do not"
			if byReturn {
				r.Why = "the column is named so"
			}
		}
	case byName && (steady || len(steps) == 0):
		r.Sure, r.Why = Sure, fmt.Sprintf("the column is named so, and every number is above zero; a typical one is %s", short(median(all)))
		r.Confirm = len(steps) == 0
		f.Feed.Value = rules.OfPrice
	default:
		f.Feed.Value = rules.OfPrice
		r.Why = fmt.Sprintf("every number is above zero, and a typical step of a series is %s %%", short(100*median(steps)))
	}
	f.Remarks = append(f.Remarks, r)
	return f.Feed.Value == rules.OfPrice
}

// unit goes by the typical size of a daily return, 0.1 % to 3 % in most books: below 0.03 fractions, up to 4 per cent, above it basis points.
// Common practice, no source; so it is never sure by size alone.
func (f *Finding) unit(t *table, found map[string][]float64) {
	var sizes []float64
	for _, vals := range found {
		for _, v := range vals {
			if v != 0 {
				sizes = append(sizes, math.Abs(v))
			}
		}
	}
	typical := median(sizes)
	names := ""
	for _, i := range t.value {
		names += strings.ToLower(t.columns[i].name) + " "
	}
	r := Remark{Key: "unit", Sure: Likely, Confirm: true, Why: fmt.Sprintf("a typical value is %s: a day of %s %% as fraction, %s %% as percent, %s %% as bp",
		short(typical), short(100*typical), short(typical), short(typical/100))}
	switch {
	case t.samples[0].Percent:
		f.Feed.Unit, r.Sure, r.Confirm = rules.Fraction, Sure, false
		r.Why = "the cells are shown as per cent, and hold fractions"
	case t.series >= 0 && strings.Contains(names, "bp"):
		f.Feed.Unit = rules.BP
		r.Why = "the column is named so; " + r.Why
	case t.series >= 0 && (strings.Contains(names, "%") || strings.Contains(names, "pct") || strings.Contains(names, "percent")):
		f.Feed.Unit = rules.Percent
		r.Why = "the column is named so; " + r.Why
	case len(sizes) == 0:
		f.Feed.Unit, r.Sure, r.Why = rules.Fraction, Guess, "every value is zero"
	case typical < 0.03:
		f.Feed.Unit = rules.Fraction
	case typical <= 4:
		f.Feed.Unit = rules.Percent
	default:
		f.Feed.Unit = rules.BP
	}
	if typical > 0.015 && typical < 0.06 || typical > 2.5 && typical < 8 {
		r.Sure = Guess
	}
	f.Remarks = append(f.Remarks, r)
}

func median(v []float64) float64 {
	if len(v) == 0 {
		return 0
	}
	v = slices.Clone(v)
	slices.Sort(v)
	return v[len(v)/2]
}

// short writes a size with three digits, without an exponent.
func short(v float64) string {
	decimals := 0
	if v != 0 {
		decimals = max(0, 2-int(math.Floor(math.Log10(math.Abs(v)))))
	}
	return strconv.FormatFloat(math.Round(v*math.Pow10(decimals))/math.Pow10(decimals), 'f', -1, 64)
}
