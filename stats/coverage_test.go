package stats_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"strayd/stats"

	"gonum.org/v1/gonum/stat/distuv"
)

func TestBinomialAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/binomial.csv") {
		n, k, p := r.int(t, "n"), r.int(t, "k"), r.float(t, "p")
		name := fmt.Sprintf("n=%d k=%d p=%v", n, k, p)
		atMost, err := stats.BinomialAtMost(k, n, p)
		if err != nil {
			t.Error(err)
		}
		atLeast, err := stats.BinomialAtLeast(k, n, p)
		if err != nil {
			t.Error(err)
		}
		near(t, name+" at most", atMost, r.float(t, "cdf"), gridTolerance)
		near(t, name+" at least", atLeast, r.float(t, "upper_inclusive"), gridTolerance)
	}
}

func TestChiSquaredAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/chi2_tail.csv") {
		x, df := r.float(t, "x"), r.int(t, "df")
		p, log10 := stats.ChiSquared(x, df)
		name := fmt.Sprintf("df=%d x=%v", df, x)
		near(t, name, p, r.float(t, "upper_tail"), gridTolerance)
		near(t, name+" log10", log10, r.float(t, "log10_upper"), gridTolerance)
	}
}

// sameTest compares a ratio, within 1e-12 of it or of 1 where it is less (it is a difference of likelihoods), and its probability.
func sameTest(t *testing.T, what string, got stats.Test, lr, p, tolerance float64) {
	t.Helper()
	within(t, what+" ratio", got.LR, lr, tolerance*math.Max(1, lr))
	near(t, what+" probability", got.P, max(p, stats.SmallestTail), tolerance*math.Max(10, lr))
}

func TestKupiecAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/kupiec_pof.csv") {
		n, x, p := r.int(t, "T"), r.int(t, "x"), r.float(t, "p")
		got, err := stats.Kupiec(x, n, p)
		if err != nil {
			t.Error(err)
		}
		name := fmt.Sprintf("T=%d p=%v x=%d", n, p, x)
		near(t, name+" ratio", got.LR, r.float(t, "LR"), gridTolerance)
		near(t, name+" probability", got.P, max(r.float(t, "p_value"), stats.SmallestTail), gridTolerance)
	}
}

func TestChristoffersenAgainstGrid(t *testing.T) {
	for _, r := range reference(t, "grid/christoffersen.csv") {
		n := stats.Transitions{N00: r.int(t, "n00"), N01: r.int(t, "n01"), N10: r.int(t, "n10"), N11: r.int(t, "n11")}
		share, err := stats.Kupiec(n.N01+n.N11, n.N00+n.N01+n.N10+n.N11, r.float(t, "p"))
		if err != nil {
			t.Error(err)
		}
		apart := n.Independence()
		both := stats.Conditional(share, apart)
		for what, test := range map[string]stats.Test{"uc": share, "ind": apart, "cc": both} {
			sameTest(t, fmt.Sprintf("%+v %s", n, what), test, r.float(t, "LR_"+what), r.float(t, "p_"+what), gridTolerance)
		}
	}
}

// hitRules are the rules of coverage.csv over the figures of a row: ref/METHODS.md.
func hitRules() map[string]func(figures) bool {
	beyond := func(c string, tail stats.Tail, level float64) func(figures) bool {
		z, _ := tail.Quantile(level / 2)
		return func(f figures) bool { return math.Abs(f[c]) > z }
	}
	predictive, _ := stats.RawT(dataWindow - 1)
	lower, _ := stats.Normal().Quantile(0.01)
	return map[string]func(figures) bool{
		"two_sided_99_normal": beyond("z", stats.Normal(), 0.01),
		"two_sided_99_t_pred": beyond("t_pred", predictive, 0.01),
		"two_sided_95_normal": beyond("z", stats.Normal(), 0.05),
		"two_sided_99_ewmaB":  beyond("z_ewma_B", stats.Normal(), 0.01),
		"lower_1pct_normal":   func(f figures) bool { return f["z"] < -lower },
		"modz_3.5":            func(f figures) bool { return math.Abs(f["mod_z_0.6745"]) > 3.5 },
	}
}

// TestCoverageOfOpenData: from the returns to the hits, their transitions and the tests (R 4.2.2, which keeps about 11 digits of a
// ratio).
func TestCoverageOfOpenData(t *testing.T) {
	rules, runs := hitRules(), map[string]dataRun{}
	for _, r := range reference(t, "ref/coverage.csv") {
		series := r["series"]
		if _, ok := runs[series]; !ok {
			runs[series] = run(t, series)
		}
		var hits []bool
		count := 0
		for _, f := range runs[series].rows[dataWindow:] {
			hit := rules[r["rule"]](f)
			hits = append(hits, hit)
			if hit {
				count++
			}
		}
		name := series + " " + r["rule"]
		n := stats.TransitionsOf(hits)
		want := stats.Transitions{N00: r.int(t, "n00"), N01: r.int(t, "n01"), N10: r.int(t, "n10"), N11: r.int(t, "n11")}
		if n != want || count != r.int(t, "x") || len(hits) != r.int(t, "T") {
			t.Errorf("%s: %d hits of %d, %+v, want %s of %s, %+v", name, count, len(hits), n, r["x"], r["T"], want)
		}
		p := r.float(t, "p")
		share, _ := stats.Kupiec(count, len(hits), p)
		apart := n.Independence()
		sameTest(t, name+" uc", share, r.float(t, "LR_uc"), r.float(t, "p_uc"), 1e-11)
		sameTest(t, name+" ind", apart, r.float(t, "LR_ind"), r.float(t, "p_ind"), 1e-11)
		sameTest(t, name+" cc", stats.Conditional(share, apart), r.float(t, "LR_cc"), r.float(t, "p_cc"), 1e-11)
		atLeast, _ := stats.BinomialAtLeast(count, len(hits), p)
		near(t, name+" binomial", atLeast, r.float(t, "binom_upper"), 1e-11)
	}
}

// TestPublishedCoverage: Jorion, Hull, the cluster exercise and Kupiec's regions; sources in worked/WORKED.md.
func TestPublishedCoverage(t *testing.T) {
	w := worked(t, "jorion_q10")
	share, _ := stats.Kupiec(6, 252, 0.01)
	apart := stats.Transitions{N00: 244, N01: 2, N10: 2, N11: 4}.Independence()
	within(t, "jorion LR_uc, printed cut off", share.LR, w.float(t, "published", "LR_uc"), 1e-3)
	within(t, "jorion LR_ind, printed cut off", apart.LR, w.float(t, "published", "LR_ind"), 1e-3)
	near(t, "jorion LR_cc", stats.Conditional(share, apart).LR, w.float(t, "recomputed", "LR_cc"), 1e-13)

	w = worked(t, "christoffersen_cluster")
	hits := make([]bool, 250)
	for _, day := range []int{40, 41, 42, 100, 101, 200, 201, 202, 203, 204} {
		hits[day-1] = true
	}
	share, _ = stats.Kupiec(10, 250, 0.04)
	apart = stats.TransitionsOf(hits).Independence()
	near(t, "cluster LR_POF", share.LR, 0, 0)
	near(t, "cluster LR_ind", apart.LR, w.float(t, "recomputed", "LR_ind"), 1e-13)
	near(t, "cluster p_ind", apart.P, w.float(t, "recomputed", "p_ind"), 1e-12)

	w = worked(t, "hull_kupiec")
	share, _ = stats.Kupiec(15, 1000, 0.01)
	near(t, "hull LR", share.LR, w.float(t, "recomputed", "LR"), 1e-12)
	near(t, "hull p", share.P, w.float(t, "recomputed", "p"), 1e-12)
}

// TestKupiecRegions: Kupiec 1995 as tabulated in Jorion: which counts are not rejected at 5 %. The printed cell of T=255, p=1 % says
// "N<7", but the formula rejects 0 as well: worked/WORKED.md.
func TestKupiecRegions(t *testing.T) {
	var regions map[string][2]int
	worked(t, "kupiec_table").into(t, "recomputed", "inclusive_region_by_p,T", &regions)
	if len(regions) != 15 {
		t.Errorf("%d regions, want 15", len(regions))
	}
	for key, want := range regions {
		var p float64
		var n int
		if _, err := fmt.Sscan(strings.ReplaceAll(key, ",", " "), &p, &n); err != nil {
			t.Fatal(err)
		}
		for x := range 2 * want[1] {
			got, err := stats.Kupiec(x, n, p)
			if inside := x >= want[0] && x <= want[1]; err != nil || (got.P > 0.05) != inside {
				t.Errorf("p=%v T=%d: %d hits have %+v, want not rejected from %d to %d", p, n, x, got, want[0], want[1])
			}
		}
	}
}

// TestZones: Basle Committee 1996, table 2.
func TestZones(t *testing.T) {
	w := worked(t, "basel_traffic_light")
	for k, want := range w.floats(t, "recomputed", "cumulative_pct") {
		atMost, _ := stats.BinomialAtMost(k, 250, 0.01)
		within(t, fmt.Sprintf("cumulative to %d", k), 100*atMost, want, 1e-9)
		within(t, fmt.Sprintf("cumulative to %d as printed", k), 100*atMost, w.floats(t, "published", "cumulative_pct_k0..10")[k], 0.006)
	}
	for hits := range 20 {
		want := stats.Green
		if hits >= 10 {
			want = stats.Red
		} else if hits >= 5 {
			want = stats.Yellow
		}
		if got, err := stats.ZoneOf(hits, 250, 0.01); got != want || err != nil {
			t.Errorf("%d hits: %s %v, want %s", hits, got, err, want)
		}
	}
	for _, r := range reference(t, "ref/counts.csv") {
		if got, err := stats.ZoneOf(r.int(t, "last250_lower1pct"), 250, 0.01); string(got) != r["zone"] || err != nil {
			t.Errorf("%s: %s %v, want %s", r["series"], got, err, r["zone"])
		}
	}
}

// TestBinomialBeyondGrid: shares and sizes the grid does not have. About the mean both tails are summed on their own and must make 1;
// elsewhere gonum's is the witness, which goes by the incomplete beta function and keeps fewer digits. No tail is 0.
func TestBinomialBeyondGrid(t *testing.T) {
	for _, n := range []int{1, 2, 15, 16, 17, 260, 5000, 100_000} {
		for _, p := range []float64{1e-6, 0.0027, 0.05, 0.3, 0.5, 0.9, 0.999} {
			mean := int(float64(n) * p)
			for _, k := range []int{0, 1, n / 3, mean, n - 1} {
				if k >= n {
					continue
				}
				name := fmt.Sprintf("n=%d p=%v k=%d", n, p, k)
				atMost, err := stats.BinomialAtMost(k, n, p)
				atLeast, err2 := stats.BinomialAtLeast(k+1, n, p)
				if err != nil || err2 != nil {
					t.Error(name, err, err2)
				}
				if k == mean {
					within(t, name+" both tails", atMost+atLeast, 1, 1e-12)
				}
				witness := distuv.Binomial{N: float64(n), P: p}.CDF(float64(k))
				near(t, name, atMost, max(witness, stats.SmallestTail), 1e-8)
			}
		}
	}
}

func TestCoverageOutOfDomain(t *testing.T) {
	for _, bad := range []struct {
		hits, n int
		p       float64
	}{{-1, 10, 0.1}, {11, 10, 0.1}, {0, 0, 0.1}, {1, 10, 0}, {1, 10, 1}, {1, 10, math.NaN()}, {1, 10, math.Inf(1)}} {
		if got, err := stats.Kupiec(bad.hits, bad.n, bad.p); err == nil {
			t.Errorf("%+v: %+v", bad, got)
		}
		if got, err := stats.BinomialAtMost(bad.hits, bad.n, bad.p); err == nil {
			t.Errorf("%+v: %v", bad, got)
		}
		if got, err := stats.BinomialAtLeast(bad.hits, bad.n, bad.p); err == nil {
			t.Errorf("%+v: %v", bad, got)
		}
		if got, err := stats.ZoneOf(bad.hits, bad.n, bad.p); err == nil {
			t.Errorf("%+v: %v", bad, got)
		}
	}
	for _, none := range []stats.Transitions{{}, {N00: 5}, {N11: 5}, {N01: 1}, {N10: 1}, {N00: 3, N01: 1}} {
		if got := none.Independence(); !(got.LR >= 0 && got.LR < 1e-9 && got.P > 0.99 && got.P <= 1) {
			t.Errorf("%+v: %+v", none, got)
		}
	}
	if p, log10 := stats.ChiSquared(math.Inf(1), 2); p != stats.SmallestTail || math.IsInf(log10, 0) {
		t.Errorf("chi-squared at infinity: %v %v", p, log10)
	}
}
