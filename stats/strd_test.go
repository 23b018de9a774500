package stats_test

import (
	"math"
	"math/big"
	"strconv"
	"strings"
	"testing"

	"strayd/stats"
)

// fixed reads decimal text as whole units of 10^-places, rounding half to even what is beyond them.
func fixed(t testing.TB, text string, places int) int64 {
	t.Helper()
	x, ok := new(big.Rat).SetString(text)
	if !ok {
		t.Fatalf("%q is not a decimal", text)
	}
	scale := new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(places)), nil)
	x.Mul(x, new(big.Rat).SetInt(scale))
	half := new(big.Int).Add(new(big.Int).Lsh(x.Num(), 1), x.Denom()) // floor(x + 1/2) = floor((2 num + den)/(2 den))
	den := new(big.Int).Lsh(x.Denom(), 1)
	quotient, rest := new(big.Int).DivMod(half, den, new(big.Int))
	if rest.Sign() == 0 && quotient.Bit(0) == 1 {
		quotient.Sub(quotient, big.NewInt(1))
	}
	if !quotient.IsInt64() {
		t.Fatalf("%q does not fit at %d places", text, places)
	}
	return quotient.Int64()
}

// places is the most decimals that any of the texts has.
func places(texts []string) int {
	most := 0
	for _, s := range texts {
		_, decimals, _ := strings.Cut(s, ".")
		most = max(most, len(decimals))
	}
	return most
}

// decimals reads a column exactly, at its own number of places.
func decimals(t testing.TB, rows []row, column string) (values []int64, one float64) {
	t.Helper()
	var texts []string
	for _, r := range rows {
		texts = append(texts, r[column])
	}
	p := places(texts)
	for _, s := range texts {
		values = append(values, fixed(t, s, p))
	}
	return values, math.Pow10(p)
}

// through is the window of values in a Panel, in Sums and in Sums fed backwards, which must agree.
func through(t testing.TB, values []int64) stats.Sums {
	t.Helper()
	p := stats.NewPanel(1, len(values))
	var s, backwards stats.Sums
	for i, k := range values {
		p.Push([]int64{k})
		s.Add(k)
		backwards.Add(values[len(values)-1-i])
	}
	if p.Sums(0) != s || backwards != s {
		t.Errorf("panel %v, sums %v, fed backwards %v", p.Sums(0), s, backwards)
	}
	return s
}

// digits15 is a figure with 15 significant digits, as the certified values are printed.
func digits15(v float64) string { return strconv.FormatFloat(v, 'e', 14, 64) }

// TestCertifiedSets: NIST Statistical Reference Datasets, univariate; see strd/PROVENANCE.md. The data are taken as the decimals
// they are, so that all 15 certified digits come out even where binary64 data would cap them at 8.
func TestCertifiedSets(t *testing.T) {
	caps := map[string]row{}
	for _, r := range reference(t, "strd/achievable_digits.csv") {
		caps[r["dataset"]] = r
	}
	sets := reference(t, "strd/certified.csv")
	if len(sets) != 9 {
		t.Errorf("%d certified sets, want 9", len(sets))
	}
	for _, r := range sets {
		name := r["dataset"]
		values, one := decimals(t, reference(t, "strd/"+name+".csv"), "y")
		if len(values) != r.int(t, "n") {
			t.Errorf("%s: %d values, want %s", name, len(values), r["n"])
		}
		s := through(t, values)
		deviation, _ := s.Deviation(one)
		r1, _ := stats.Autocorrelation(values)
		for what, got := range map[string]float64{"mean": s.Mean(one), "sd": deviation, "r1": r1} {
			certified := r.float(t, "cert_"+what)
			if digits15(got) != digits15(certified) {
				t.Errorf("%s %s: %v, certified %v", name, what, got, certified)
			}
			near(t, name+" "+what+" exact", got, r.float(t, "exact_"+what), 2.3e-16)
			if off := relative(got, certified); off > 0 && -math.Log10(off) < min(14.3, caps[name].float(t, "ceiling_"+what)) {
				t.Errorf("%s %s: fewer digits (%.1f) than binary64 data permit (%s)", name, what, -math.Log10(off), caps[name]["ceiling_"+what])
			}
		}
	}
}
