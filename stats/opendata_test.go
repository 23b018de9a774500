package stats_test

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"testing"

	"strayd/stats"
)

// The open data series are binary64 returns of 17 digits, taken here at 1e-18 a unit, so that rounding them is below 1e-16 of their
// deviation. The definitions are in ref/METHODS.md.
const (
	dataPlaces = 18
	dataOne    = 1e18
	dataWindow = 250
)

var dataSeries = []string{"eustock_dax", "eustock_smi", "eustock_cac", "eustock_ftse", "nysesw"}

// figures are what is known of a row before it is taken, by the names of the reference's columns.
type figures map[string]float64

// dataRun scores every row of a series against the window before it; rows[i] belongs to row i+1.
type dataRun struct {
	values []int64
	rows   []figures
}

func dataValues(t testing.TB, series string) (values []int64) {
	t.Helper()
	for _, r := range reference(t, "data/"+series+".csv") {
		values = append(values, fixed(t, r["ret"], dataPlaces))
	}
	return values
}

// run drives all scales over a series. A decoy beside it in the panels misses every third value.
func run(t testing.TB, series string) dataRun {
	t.Helper()
	d := dataRun{}
	panel := stats.NewPanel(2, dataWindow)
	sorted := stats.NewSortedPanel(2, dataWindow)
	first := stats.NewWeightedPanel(2, 1, 0.94, dataOne)
	seeded := stats.NewWeightedPanel(2, dataWindow, 0.94, dataOne)
	d.values = dataValues(t, series)
	for i, k := range d.values {
		var f figures
		if panel.Full(0) {
			f = score(k, panel.Sums(0), sorted.Sorted(0), first, seeded)
		}
		d.rows = append(d.rows, f)
		decoy := -k / 3
		if i%3 == 0 {
			decoy = stats.Missing
		}
		for _, p := range []interface{ Push([]int64) }{panel, sorted, first, seeded} {
			p.Push([]int64{k, decoy})
		}
	}
	return d
}

func score(k int64, s stats.Sums, w stats.Sorted, first, seeded *stats.WeightedPanel) figures {
	f := figures{"x": float64(k) / dataOne, "mean250": s.Mean(dataOne)}
	f["sd250"], _ = s.Deviation(dataOne)
	f["z"] = s.Distance(k, dataOne) / f["sd250"]
	f["p_norm2"], f["log10_p_norm2"] = stats.Normal().TwoSided(f["z"])
	f["t_pred"] = f["z"] / math.Sqrt(1+1/float64(dataWindow))
	predictive, _ := stats.RawT(dataWindow - 1)
	f["p_t2"], f["log10_p_t2"] = predictive.TwoSided(f["t_pred"])
	f["sd_ewma_A"], _ = first.Deviation(0)
	f["z_ewma_A"] = f["x"] / f["sd_ewma_A"]
	f["sd_ewma_B"], _ = seeded.Deviation(0)
	f["z_ewma_B"] = f["x"] / f["sd_ewma_B"]
	f["median250"], _ = w.Median(dataOne)
	f["mad250"], _ = w.MAD(dataOne)
	f["mod_z_0.6745"] = 0.6745 * w.Distance(k, dataOne) / f["mad250"]
	f["z_mad_exact_consistency"] = w.Distance(k, dataOne) / (stats.ExactNormalMAD * f["mad250"])
	f["z_mad_1.4826"] = w.Distance(k, dataOne) / (stats.NormalMAD * f["mad250"])
	atMost, atLeast := w.Ranks(k)
	f["n_le"], f["n_ge"] = float64(atMost), float64(atLeast)
	f["p_emp_lo"] = stats.RankLower(atMost, len(w))
	f["p_emp_up"] = stats.RankUpper(atLeast, len(w))
	f["p_emp_2"] = stats.RankTail(atMost, atLeast, len(w))
	return f
}

// TestOpenDataRows compares the listed rows with exact arithmetic (big integers and mpmath) and, for what that file lacks, with R.
// 1e-13 of a deviation is allowed for centres and scores, which the rounding of the data to 1e-18 moves by about 1e-15; and
// 1e-12 of a tail.
func TestOpenDataRows(t *testing.T) {
	for _, series := range dataSeries {
		d := run(t, series)
		for file, columns := range map[string][]string{
			"_rows_exact.csv": {"sd250", "p_norm2", "log10_p_norm2", "p_t2", "log10_p_t2", "sd_ewma_A", "sd_ewma_B", "mad250", "n_le", "n_ge"},
			"_rows.csv":       {"n_le", "n_ge", "p_emp_lo", "p_emp_up", "p_emp_2"},
		} {
			rows := reference(t, "ref/"+series+file)
			for _, r := range rows {
				f := d.rows[r.int(t, "row")-1]
				name := fmt.Sprintf("%s row %s ", series, r["row"])
				for _, c := range columns {
					near(t, name+c, f[c], r.float(t, c), 1e-12)
				}
				near(t, name+"sd250", f["sd250"], r.float(t, "sd250"), 1e-15)
				checkScores(t, name, f, r)
			}
		}
	}
}

func checkScores(t *testing.T, name string, f figures, r row) {
	t.Helper()
	for c, scale := range map[string]float64{"mean250": f["sd250"], "median250": f["mad250"], "z": 1, "t_pred": 1, "z_ewma_A": 1, "z_ewma_B": 1,
		"mod_z_0.6745": 1, "z_mad_exact_consistency": 1, "z_mad_1.4826": 1} {
		if r[c] == "" {
			continue
		}
		if off := math.Abs(f[c]-r.float(t, c)) / scale; !(off <= 1e-13) {
			t.Errorf("%s%s: %v, want %s", name, c, f[c], r[c])
		}
	}
}

// TestOpenDataCounts counts over every scored row of every series (R; no statistic lies within 4e-5 of a threshold).
func TestOpenDataCounts(t *testing.T) {
	oneSided, _ := stats.Normal().Quantile(0.01)
	predictive, _ := stats.RawT(dataWindow - 1)
	twoSided, _ := predictive.Quantile(0.005)
	beyond := func(c string, line float64) func(figures) bool {
		return func(f figures) bool { return math.Abs(f[c]) > line }
	}
	rules := map[string]func(figures) bool{
		"z_gt_1.96": beyond("z", 1.96), "z_gt_2.576": beyond("z", 2.576), "z_gt_3": beyond("z", 3), "z_gt_4.5": beyond("z", 4.5),
		"z_lt_m2.3263":  func(f figures) bool { return f["z"] < -oneSided },
		"t_pred_1pct":   beyond("t_pred", twoSided),
		"ewmaA_gt_1.96": beyond("z_ewma_A", 1.96), "ewmaA_gt_2.576": beyond("z_ewma_A", 2.576), "ewmaA_gt_3": beyond("z_ewma_A", 3),
		"ewmaB_gt_2.576": beyond("z_ewma_B", 2.576), "modz_gt_3.5": beyond("mod_z_0.6745", 3.5),
		"emp_2_le_0.01": func(f figures) bool { return f["p_emp_2"] <= 0.01 },
	}
	for _, r := range reference(t, "ref/counts.csv") {
		rows := run(t, r["series"]).rows[dataWindow:]
		if len(rows) != r.int(t, "T") {
			t.Errorf("%s: %d scored rows, want %s", r["series"], len(rows), r["T"])
		}
		for name, rule := range rules {
			if got := countIf(rows, rule); got != r.int(t, name) {
				t.Errorf("%s: %s: %d, want %s", r["series"], name, got, r[name])
			}
		}
		last := countIf(rows[len(rows)-250:], rules["z_lt_m2.3263"])
		if last != r.int(t, "last250_lower1pct") {
			t.Errorf("%s: %d of the last 250 below the lower 1 %% line, want %s", r["series"], last, r["last250_lower1pct"])
		}
		top := slices.MaxFunc(rows, func(a, b figures) int { return int(math.Copysign(1, math.Abs(a["z"])-math.Abs(b["z"]))) })
		near(t, r["series"]+" greatest |z|", math.Abs(top["z"]), r.float(t, "max_abs_z"), 1e-13)
	}
}

func countIf(rows []figures, rule func(figures) bool) (n int) {
	for _, f := range rows {
		if rule(f) {
			n++
		}
	}
	return n
}

// TestOpenDataScan: what a scan at 3 deviations leaves out is inside, and it names little else.
func TestOpenDataScan(t *testing.T) {
	counts := map[string]int{}
	for _, r := range reference(t, "ref/counts.csv") {
		counts[r["series"]] = r.int(t, "z_gt_3")
	}
	for _, series := range dataSeries {
		panel := stats.NewPanel(1, dataWindow)
		gate := stats.PlainGate(dataWindow, dataWindow, stats.Fixed(3), false)
		named := 0
		for _, k := range dataValues(t, series) {
			if found := panel.Scan([]int64{k}, gate, nil); panel.Full(0) {
				named += len(found)
			}
			panel.Push([]int64{k})
		}
		if named != counts[series] {
			t.Errorf("%s: a scan at z=3 named %d rows, want %d", series, named, counts[series])
		}
	}
}

// TestOpenDataWhole: mean, deviation, median, MAD and autocorrelation of whole series (mpmath, and R for median and MAD).
func TestOpenDataWhole(t *testing.T) {
	plain := map[string]row{}
	for _, r := range reference(t, "ref/stats.csv") {
		plain[r["series"]] = r
	}
	for _, r := range reference(t, "ref/stats_exact.csv") {
		name := r["series"]
		values := dataValues(t, name)
		s := through(t, values)
		deviation, _ := s.Deviation(dataOne)
		near(t, name+" sd", deviation, r.float(t, "sd"), 1e-15)
		near(t, name+" mean", s.Mean(dataOne)/deviation, r.float(t, "mean")/deviation, 1e-13)
		r1, _ := stats.Autocorrelation(values)
		near(t, name+" r1", r1, r.float(t, "r1"), 1e-12)
		w := stats.SortedOf(values)
		median, _ := w.Median(dataOne)
		mad, _ := w.MAD(dataOne)
		near(t, name+" median", median, plain[name].float(t, "median"), 1e-14)
		near(t, name+" mad", mad, plain[name].float(t, "mad_raw"), 1e-14)
		if low, _, _ := w.Lines(1); strconv.FormatFloat(float64(low)/dataOne, 'g', 15, 64) != strconv.FormatFloat(plain[name].float(t, "min"), 'g', 15, 64) {
			t.Errorf("%s: lowest %d, want %s", name, low, plain[name]["min"])
		}
	}
}
