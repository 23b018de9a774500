package stats_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"strayd/stats"
)

// within fails unless got is within an absolute tolerance of want: for published figures, which are rounded.
func within(t testing.TB, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: got %.17g, want %.17g within %v", what, got, want, tolerance)
	}
}

// TestHandbookNormalTable: NIST/SEMATECH e-Handbook 1.3.6.7.1 (published digits from memory, recomputed).
func TestHandbookNormalTable(t *testing.T) {
	w := worked(t, "nist_normal_table")
	exact, published := w.floats(t, "recomputed", "area_0_to_x"), w.floats(t, "published", "area_0_to_x")
	for i, x := range w.floats(t, "inputs", "x") {
		p, _ := stats.Normal().Upper(x)
		within(t, fmt.Sprintf("area to %v", x), 0.5-p, published[i], 0.5e-5+1e-12)
		within(t, fmt.Sprintf("area to %v exactly", x), 0.5-p, exact[i], 1e-15)
	}
}

// TestHandbookTTable: NIST/SEMATECH e-Handbook 1.3.6.7.2. Seven cells of its column 0.001 are misprinted; the true values are
// listed in worked/WORKED.md.
func TestHandbookTTable(t *testing.T) {
	w := worked(t, "nist_t_table")
	var rows [][]any
	w.into(t, "published", "rows_df_then_t", &rows)
	var misprints [][4]float64
	w.into(t, "recomputed", "misprinted_cells_df_p_printed_true", &misprints)
	columns := w.floats(t, "inputs", "p_columns")
	if len(rows) != 34 || len(misprints) != 7 {
		t.Fatalf("%d rows and %d misprints, want 34 and 7", len(rows), len(misprints))
	}
	for _, r := range rows {
		tail, df := stats.Normal(), math.Inf(1)
		if r[0] != "Inf" {
			fmt.Sscan(r[0].(string), &df)
			tail = rawT(t, df)
		}
		for i, p := range columns {
			got, _ := tail.Quantile(p)
			want, allowed := r[i+1].(float64), 0.5e-3+1e-9
			if at := slices.IndexFunc(misprints, func(m [4]float64) bool { return m[0] == df && m[1] == p }); at >= 0 {
				if math.Abs(got-want) <= allowed {
					t.Errorf("df=%v p=%v: the printed %v is known to be a misprint", df, p, want)
				}
				want, allowed = misprints[at][3], 0.5e-4+1e-9
			}
			within(t, fmt.Sprintf("df=%v p=%v", df, p), got, want, allowed)
		}
	}
}

// TestFarNormalTable: Abramowitz and Stegun, table 26.2, -log10 Q(x) out to 500 (published digits from memory, recomputed).
func TestFarNormalTable(t *testing.T) {
	w := worked(t, "as_26_2_log_tail")
	exact, published := w.floats(t, "recomputed", "-log10Q"), w.floats(t, "published", "-log10Q")
	for i, x := range w.floats(t, "inputs", "x") {
		_, log10 := stats.Normal().Upper(x)
		within(t, fmt.Sprintf("-log10 Q(%v)", x), -log10, published[i], 0.5e-5+1e-9)
		near(t, fmt.Sprintf("-log10 Q(%v) exactly", x), -log10, exact[i], 1e-14)
	}
}

// TestGrubbsExample: NIST/SEMATECH e-Handbook 1.3.5.17.1, where the plain z of a gross outlier inside its own sample stays below 3
// and the modified z does not.
func TestGrubbsExample(t *testing.T) {
	w := worked(t, "nist_grubbs")
	var values []int64
	for _, text := range w.numbers(t, "inputs", "y") {
		values = append(values, fixed(t, text, 2))
	}
	s, sorted := through(t, values), stats.SortedOf(values)
	deviation, _ := s.Deviation(100)
	near(t, "mean", s.Mean(100), w.float(t, "recomputed", "mean"), 1e-15)
	near(t, "s", deviation, w.float(t, "recomputed", "s"), 1e-15)
	grubbs := s.Distance(values[len(values)-1], 100) / deviation
	near(t, "G", grubbs, w.float(t, "recomputed", "G"), 1e-14)
	within(t, "G as printed, cut off", grubbs, w.float(t, "published", "G"), 1e-4)
	n := float64(len(values))
	quantile, _ := rawT(t, n-2).Quantile(0.05 / n)
	critical := (n - 1) / math.Sqrt(n) * math.Sqrt(quantile*quantile/(n-2+quantile*quantile))
	near(t, "critical value", critical, w.float(t, "recomputed", "critical_one_sided"), 1e-12)
	median, _ := sorted.Median(100)
	mad, _ := sorted.MAD(100)
	near(t, "median", median, w.float(t, "recomputed", "median"), 0)
	near(t, "MAD", mad, w.float(t, "recomputed", "MAD"), 1e-15)
	for i, want := range w.floats(t, "recomputed", "modified_z_0.6745") {
		near(t, fmt.Sprintf("modified z %d", i), 0.6745*sorted.Distance(values[i], 100)/mad, want, 1e-12)
	}
}

// TestHeatFlow: NIST/SEMATECH e-Handbook 1.4.2.8 (published values from memory, recomputed in R).
func TestHeatFlow(t *testing.T) {
	w := worked(t, "nist_heatflow")
	values, one := decimals(t, reference(t, "worked/zarr13.csv"), "y")
	s := through(t, values)
	deviation, _ := s.Deviation(one)
	r1, _ := stats.Autocorrelation(values)
	quantile, _ := rawT(t, 194).Quantile(0.025)
	half := quantile * deviation / math.Sqrt(float64(len(values)))
	near(t, "mean", s.Mean(one), w.float(t, "recomputed", "mean"), 1e-14)
	near(t, "s", deviation, w.float(t, "recomputed", "s"), 1e-13)
	near(t, "t", quantile, w.float(t, "recomputed", "t"), 1e-13)
	near(t, "r1", r1, w.float(t, "recomputed", "r1"), 1e-13)
	for i, want := range w.floats(t, "recomputed", "CI") {
		near(t, "interval", s.Mean(one)+half*float64(2*i-1), want, 1e-14)
	}
	within(t, "mean as printed", s.Mean(one), w.float(t, "published", "mean"), 1e-5)
	within(t, "s as printed", deviation, w.float(t, "published", "s"), 1e-7)
}

// TestLewAutocorrelation: NIST/SEMATECH e-Handbook 1.3.5.12 prints -0.31 at lag 1.
func TestLewAutocorrelation(t *testing.T) {
	values, _ := decimals(t, reference(t, "strd/Lew.csv"), "y")
	r1, ok := stats.Autocorrelation(values)
	within(t, "r1", r1, worked(t, "nist_autocorrelation").floats(t, "published", "r1..r12")[0], 0.005)
	for _, none := range [][]int64{nil, {5}, {5, 5, 5}} {
		if r, bad := stats.Autocorrelation(none); bad || r != 0 || !ok {
			t.Errorf("autocorrelation of %v: %v, %v", none, r, bad)
		}
	}
}

// TestCeilingOfAScore: Shiffler 1988, The American Statistician 42:79-80: inside its own sample no z exceeds (n-1)/sqrt(n), and one
// value among equal ones reaches it.
func TestCeilingOfAScore(t *testing.T) {
	w := worked(t, "shiffler")
	for i, n := range w.floats(t, "inputs", "n") {
		values := make([]int64, int(n))
		values[3] = 1e13
		s := through(t, values)
		deviation, _ := s.Deviation(one)
		near(t, fmt.Sprintf("n=%v", n), s.Distance(values[3], one)/deviation, w.floats(t, "recomputed", "max")[i], 1e-14)
	}
}

// TestTradeQuotes: the z that the trade quotes for a confidence; common practice, no source. Each is what its printed digits round.
func TestTradeQuotes(t *testing.T) {
	for confidence, quote := range map[float64]struct{ z, unit float64 }{0.90: {1.645, 1e-3}, 0.95: {1.96, 1e-2}, 0.99: {2.58, 1e-2}} {
		line, err := stats.Normal().LineOfConfidence(confidence, stats.TwoSided)
		if err != nil {
			t.Error(err)
		}
		within(t, fmt.Sprintf("%v%%", 100*confidence), line.Z, quote.z, quote.unit/2)
	}
}

// TestOnceInDays: a t with 5 degrees of freedom scaled to unit variance against the normal, and the factors of thin history, t(n-1)
// sqrt(1+1/n) at 99 %. The figures were computed independently before this program was written, to two or three digits.
func TestOnceInDays(t *testing.T) {
	for z, want := range map[float64][2]float64{2: {20, 22}, 3: {85, 370}, 4: {280, 15_800}, 5: {750, 1.7e6}, 6: {1740, 5e8}} {
		for i, tail := range []stats.Tail{scaledT(t, 5), stats.Normal()} {
			line, err := tail.LineOfZ(z, stats.TwoSided)
			if err != nil {
				t.Error(err)
			}
			near(t, fmt.Sprintf("once in days at z=%v, tail %d", z, i), line.Days, want[i], 0.03)
		}
	}
	for n, want := range map[float64]float64{5: 5.04, 10: 3.41, 20: 2.93} {
		z, _ := rawT(t, n-1).Quantile(0.005)
		within(t, fmt.Sprintf("factor at n=%v", n), z*math.Sqrt(1+1/n), want, 0.005)
	}
}
