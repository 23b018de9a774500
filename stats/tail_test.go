package stats_test

import (
	"fmt"
	"math"
	"math/big"
	"testing"

	"strayd/stats"
)

const gridTolerance = 1e-12

func rawT(t testing.TB, df float64) stats.Tail {
	t.Helper()
	tail, err := stats.RawT(df)
	if err != nil {
		t.Fatal(err)
	}
	return tail
}

func scaledT(t testing.TB, df float64) stats.Tail {
	t.Helper()
	tail, err := stats.ScaledT(df)
	if err != nil {
		t.Fatal(err)
	}
	return tail
}

// checkTail compares both tails and the logarithm with a row of the grid (mpmath, 70 digits; see grid/README.md).
func checkTail(t *testing.T, tail stats.Tail, z float64, r row) {
	t.Helper()
	name := fmt.Sprintf("z=%v df=%s", z, r["df"])
	p, log10 := tail.Upper(z)
	near(t, name+" upper", p, max(r.float(t, "upper_tail"), stats.SmallestTail), gridTolerance)
	near(t, name+" log10", log10, r.float(t, "log10_upper"), gridTolerance)
	two, log2 := tail.TwoSided(z)
	near(t, name+" two-sided", two, max(r.float(t, "two_sided"), stats.SmallestTail), gridTolerance)
	near(t, name+" two-sided log10", log2, logTwice(r, t), gridTolerance)
	lower, lowerLog := tail.Lower(-z)
	if lower != p || lowerLog != log10 {
		t.Errorf("%s: the lower tail of -z is %v, the upper tail of z %v", name, lower, p)
	}
}

// logTwice is log10 of the two-sided tail: near 1 from its distance to 1, which the text of the grid keeps.
func logTwice(r row, t *testing.T) float64 {
	p, ok := new(big.Float).SetPrec(200).SetString(r["two_sided"])
	if !ok {
		t.Fatalf("two_sided %q", r["two_sided"])
	}
	rest, _ := new(big.Float).Sub(big.NewFloat(1), p).Float64()
	if rest < 0.5 {
		return math.Log1p(-rest) / math.Ln10
	}
	return r.float(t, "log10_upper") + math.Log10(2)
}

func TestNormalTailsAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/normal_tail.csv") {
		checkTail(t, stats.Normal(), r.float(t, "z"), r)
	}
}

func TestStudentTailsAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/t_tail.csv") {
		checkTail(t, rawT(t, r.float(t, "df")), r.float(t, "t"), r)
	}
}

func TestNormalQuantilesAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/normal_quantile.csv") {
		p := r.float(t, "p") // the grid has P(Z <= x) = p; the upper tail of -x is the same
		z, err := stats.Normal().Quantile(p)
		if err != nil {
			t.Errorf("p=%v: %v", p, err)
		}
		near(t, fmt.Sprintf("p=%v", p), -z, r.float(t, "quantile"), gridTolerance)
	}
}

func TestStudentQuantilesAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/t_quantile.csv") {
		df, p := r.float(t, "df"), r.float(t, "p_upper")
		z, err := rawT(t, df).Quantile(p)
		if err != nil {
			t.Errorf("df=%v p=%v: %v", df, p, err)
		}
		near(t, fmt.Sprintf("df=%v p=%v", df, p), z, r.float(t, "t"), gridTolerance)
		if df > 2 {
			scaled, _ := scaledT(t, df).Quantile(p)
			near(t, fmt.Sprintf("scaled df=%v p=%v", df, p), scaled, r.float(t, "t")*math.Sqrt((df-2)/df), gridTolerance)
		}
	}
}
