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
	if math.Abs(z) > 1e-15 {
		near(t, name+" two-sided log10", log2, logTwice(r, t), gridTolerance)
	}
	lower, lowerLog := tail.Lower(-z)
	if lower != p || lowerLog != log10 {
		t.Errorf("%s: the lower tail of -z is %v, the upper tail of z %v", name, lower, p)
	}
}

// logTwice is log10 of the two-sided tail: near 1 from its distance to 1, which the 30 digits of the grid keep for z above 1e-15.
func logTwice(r row, t *testing.T) float64 {
	if r.float(t, "two_sided") < 0.5 {
		return r.float(t, "log10_upper") + math.Log10(2)
	}
	p, ok := new(big.Float).SetPrec(200).SetString(r["two_sided"])
	if !ok {
		t.Fatalf("two_sided %q", r["two_sided"])
	}
	rest, _ := new(big.Float).Sub(big.NewFloat(1), p).Float64()
	return math.Log1p(-rest) / math.Ln10
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

// TestStudentTailsBeyondGrid: fractional and very large degrees of freedom, t out to 1e300 (mpmath; see the file's first line).
func TestStudentTailsBeyondGrid(t *testing.T) {
	for _, r := range reference(t, "grid/t_tail_more.csv") {
		df, x := r.float(t, "df"), r.float(t, "t")
		checkTail(t, rawT(t, df), x, r)
		if df > 2 && x < 1e200 {
			z := x * math.Sqrt((df-2)/df)
			_, log10 := scaledT(t, df).Upper(z)
			near(t, fmt.Sprintf("scaled df=%v z=%v", df, z), log10, r.float(t, "log10_upper"), 1e-12)
		}
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

// TestQuantileInvertsTail goes there and back over many degrees of freedom and tails. ln P is the safer witness: its relative
// error is that of z times at least 1.
func TestQuantileInvertsTail(t *testing.T) {
	tails := []stats.Tail{stats.Normal(), scaledT(t, 2.01), scaledT(t, 5)}
	for _, df := range []float64{1, 1.5, 2, 4, 19, 59, 249, 1000, 32_767, stats.MaxDF} {
		tails = append(tails, rawT(t, df))
	}
	for _, tail := range tails {
		before := math.Inf(-1)
		for _, p := range []float64{1 - 1e-16, 0.999, 0.75, 0.51, 0.5, 0.49999999, 0.3, 0.25, 0.2499, 0.1, 0.04, 1e-3, 1e-9, 1e-17,
			1e-40, 1e-200, 1e-300, stats.SmallestTail} {
			z, err := tail.Quantile(p)
			if err != nil {
				t.Fatalf("%+v p=%v: %v", tail, p, err)
			}
			if z <= before || math.IsInf(z, 0) {
				t.Errorf("%+v: z(%v)=%v is not above %v", tail, p, z, before)
			}
			before = z
			back, _ := tail.Upper(z)
			near(t, fmt.Sprintf("%+v p=%v z=%v", tail, p, z), back, p, 2e-12)
			if p >= 0.5 && p < 1-1e-15 {
				mirrored, _ := tail.Quantile(1 - p)
				near(t, fmt.Sprintf("%+v mirrored p=%v", tail, p), mirrored, -z, 0)
			}
		}
	}
}

// TestTailsAtTheEdges: nothing is NaN, infinite or a zero tail, and what cannot be judged looks as far out as can be.
func TestTailsAtTheEdges(t *testing.T) {
	for _, tail := range []stats.Tail{stats.Normal(), rawT(t, 1), rawT(t, 249), scaledT(t, 5), scaledT(t, 2.0000001), rawT(t, stats.MaxDF)} {
		for _, z := range []float64{0, math.Copysign(0, -1), 5e-324, 1e-300, 1, 38, 1e100, 1e200, math.MaxFloat64, math.Inf(1), math.NaN()} {
			for name, f := range map[string]func(float64) (float64, float64){"upper": tail.Upper, "lower": tail.Lower, "two": tail.TwoSided} {
				for _, v := range []float64{z, -z} {
					p, log10 := f(v)
					if !(p >= stats.SmallestTail && p <= 1 && log10 <= 0 && log10 >= -math.MaxFloat64) || math.Signbit(log10) && log10 == 0 {
						t.Errorf("%+v %s(%v) = %v, %v", tail, name, v, p, log10)
					}
				}
			}
		}
		if p, _ := tail.TwoSided(math.NaN()); p > 1e-300 && tail != rawT(t, 1) {
			t.Errorf("%+v: NaN looks ordinary: %v", tail, p)
		}
		for _, p := range []float64{0, 1, -0.1, 1.1, math.NaN(), math.Inf(1), stats.SmallestTail / 2} {
			if z, err := tail.Quantile(p); err == nil {
				t.Errorf("%+v: quantile of %v is %v, want an error", tail, p, z)
			}
		}
	}
	for _, df := range []float64{0, 0.5, -1, stats.MaxDF * 2, math.NaN(), math.Inf(1)} {
		if _, err := stats.RawT(df); err == nil {
			t.Errorf("raw t with %v degrees of freedom: want an error", df)
		}
	}
	for _, df := range []float64{2, 1, 0, stats.MaxDF * 2, math.NaN(), math.Inf(1)} {
		if _, err := stats.ScaledT(df); err == nil {
			t.Errorf("scaled t with %v degrees of freedom: want an error", df)
		}
	}
}

// TestTailsFall: a tail never grows as z does, across the seams between the methods.
func TestTailsFall(t *testing.T) {
	for _, tail := range []stats.Tail{stats.Normal(), rawT(t, 1), rawT(t, 3.3), rawT(t, 249), scaledT(t, 5), rawT(t, 1e5)} {
		before, beforeTwo := 0.0, 0.0
		for z := -3.0; z < 60; z += 0.001 {
			_, log10 := tail.Upper(z)
			_, two := tail.TwoSided(z)
			if log10 > before*(1-1e-13) || z > 0 && two > beforeTwo*(1-1e-13) {
				t.Fatalf("%+v at z=%v: log10 %v after %v, two-sided %v after %v", tail, z, log10, before, two, beforeTwo)
			}
			before, beforeTwo = log10, two
		}
	}
}

func FuzzTail(f *testing.F) {
	f.Add(5.0, 3.0)
	f.Add(1.0, 1e308)
	f.Add(999_999.0, 37.4)
	f.Fuzz(func(t *testing.T, df, z float64) {
		tail, err := stats.RawT(df)
		if err != nil {
			return
		}
		p, log10 := tail.Upper(z)
		if !(p >= stats.SmallestTail && p <= 1 && log10 <= 0 && log10 >= -math.MaxFloat64) {
			t.Fatalf("df %v, z %v: %v, %v", df, z, p, log10)
		}
		if p > stats.SmallestTail && p < 1 {
			back, err := tail.Quantile(p)
			again, _ := tail.Upper(back)
			if err != nil || !(relative(again, p) < 2e-12) {
				t.Fatalf("df %v, z %v: tail %v, quantile %v with tail %v, %v", df, z, p, back, again, err)
			}
		}
	})
}

func BenchmarkTail(b *testing.B) {
	for name, tail := range map[string]stats.Tail{"normal": stats.Normal(), "t5": scaledT(b, 5), "t59": rawT(b, 59), "t249": rawT(b, 249)} {
		b.Run("TwoSided/"+name, func(b *testing.B) {
			for b.Loop() {
				tail.TwoSided(4.27)
			}
		})
		b.Run("Quantile/"+name, func(b *testing.B) {
			for b.Loop() {
				_, _ = tail.Quantile(0.00135)
			}
		})
	}
}
