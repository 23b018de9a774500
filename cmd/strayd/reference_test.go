package main

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

// The open series, run through init, pass and history, against figures of R and of exact arithmetic (testdata/reference/ref, defined
// in its METHODS.md). The reference's windows hold values as received, so that every range here keeps flagged values.
const referenceRanges = `ranges:
  - {name: normal, window: 250, tail: normal, predictive: false, pending: keep, watch: {z: 1.96}, breach: {z: 3}}
  - {name: far, window: 250, tail: normal, predictive: false, pending: keep, watch: {z: 2.576}, breach: {z: 4.5}}
  - {name: below, window: 250, tail: normal, predictive: false, pending: keep, side: lower, watch: {tail: 5%}, breach: {tail: 1%}}
  - {name: predictive, window: 250, tail: predictive-t, pending: keep, watch: {tail: 5%}, breach: {tail: 1%}}
  - {name: weighted, window: 250, scale: weighted, tail: normal, pending: keep, watch: {z: 1.96}, breach: {z: 2.576}}
  - {name: mad, window: 250, scale: mad, tail: normal, pending: keep, watch: {z: 3}, breach: {z: 3.5}}
  - {name: rank, window: 250, tail: rank, pending: keep, watch: {tail: 5%}, breach: {tail: 1%}}
`

var openSeries = []string{"eustock_dax", "eustock_smi", "eustock_cac", "eustock_ftse", "nysesw"}

// openDates gives the dates of an open series: its own, or invented business days from 1991-07-01 on.
func openDates(t *testing.T, rows []record) []string {
	d, _ := rules.DateOf(1991, 7, 1)
	out := make([]string, len(rows))
	for i, r := range rows {
		if out[i] = r["date"]; out[i] != "" {
			continue
		}
		for d.Weekday() == time.Saturday || d.Weekday() == time.Sunday {
			d++
		}
		out[i] = d.String()
		d++
	}
	return out
}

// openHistory runs every open series through the program. The rows of a series and range are in the order of its dates, so that
// row i of the reference is at index i-1.
func openHistory(t *testing.T) map[string]map[string][]record {
	f := newFolder(t, referenceRanges)
	for _, series := range openSeries {
		rows := reference(t, "data/"+series+".csv")
		dates := openDates(t, rows)
		var text strings.Builder
		text.WriteString("date,series,return\n")
		for i, r := range rows {
			fmt.Fprintf(&text, "%s,%s,%s\n", dates[i], series, r["ret"])
		}
		f.write("inbox/"+series+".csv", text.String())
	}
	f.must("pass", "--settled")
	out := map[string]map[string][]record{}
	for _, series := range openSeries {
		out[series] = map[string][]record{}
		for _, r := range f.list("history", series) {
			out[series][r["range"]] = append(out[series][r["range"]], r)
		}
	}
	return out
}

func TestReferenceThroughTheProgram(t *testing.T) {
	history := openHistory(t)
	t.Run("figures", func(t *testing.T) { testReferenceFigures(t, history) })
	t.Run("counts", func(t *testing.T) { testReferenceCounts(t, history) })
}

// halfUnit is half a unit of the fixed point, by which every return differs from the reference's at most.
const halfUnit = 0.5e-15

// A return is held at 1e-15, so that it may differ from the reference's by e = 0.5e-15. The mean of such differences is at most e,
// so is the median; a deviation with divisor n-1 moves by at most e sqrt(n/(n-1)), a root of a weighted mean square by at most e
// (both are norms), a MAD by at most 2e. R's own figures add 2.6e-17 of the deviation to the mean, 2.9e-16 to the deviation and
// 2.0e-15 to z (METHODS.md).
func testReferenceFigures(t *testing.T, history map[string]map[string][]record) {
	for _, series := range openSeries {
		ranges := history[series]
		wanted := reference(t, "ref/"+series+"_rows.csv")
		if len(wanted) < 10 {
			t.Fatalf("%s: the reference has %d rows", series, len(wanted))
		}
		for _, want := range wanted {
			row, err := strconv.Atoi(want["row"])
			if err != nil {
				t.Fatal(err)
			}
			c := &figureCheck{t: t, series: series, row: row, want: want}
			n := 250.0
			sd, mad := c.ref("sd250"), 1.4826*c.ref("mad250")
			zOff := func(sd, centre, scale float64, z string) float64 {
				return (halfUnit+centre+math.Abs(c.ref(z))*scale)/sd + 4e-15
			}
			sdOff := halfUnit * math.Sqrt(n/(n-1))

			c.at(ranges["normal"])
			c.near("n", 250, 0)
			c.is("mean", "mean250", halfUnit+1e-16*sd)
			c.is("deviation", "sd250", sdOff+1e-15*sd)
			c.is("z", "z", zOff(sd, halfUnit, sdOff, "z"))
			c.tail("p_norm2", "log10_p_norm2", zOff(sd, halfUnit, sdOff, "z"), c.ref("z"))

			c.at(ranges["predictive"])
			c.is("z", "t_pred", zOff(sd, halfUnit, sdOff, "t_pred"))
			c.tail("p_t2", "log10_p_t2", zOff(sd, halfUnit, sdOff, "t_pred"), c.ref("t_pred"))

			c.at(ranges["weighted"])
			ewma := c.ref("sd_ewma_B")
			c.near("mean", 0, 0)
			c.is("deviation", "sd_ewma_B", halfUnit+2e-15*ewma)
			c.is("z", "z_ewma_B", zOff(ewma, 0, halfUnit, "z_ewma_B"))

			c.at(ranges["mad"])
			c.is("mean", "median250", halfUnit+1e-16*sd)
			c.near("deviation", mad, 1.4826*2*halfUnit+1e-15*sd)
			c.is("z", "z_mad_1.4826", zOff(mad, halfUnit, 1.4826*2*halfUnit, "z_mad_1.4826"))

			c.at(ranges["rank"])
			c.is("tail", "p_emp_2", 2e-16)
		}
	}
}

// figureCheck compares one row of the history with one of the reference.
type figureCheck struct {
	t      *testing.T
	series string
	row    int
	want   record
	got    record
}

func (c *figureCheck) at(rows []record) {
	c.t.Helper()
	if c.row > len(rows) {
		c.t.Fatalf("%s: history has %d rows, the reference looks at %d", c.series, len(rows), c.row)
	}
	c.got = rows[c.row-1]
}

func (c *figureCheck) ref(column string) float64 {
	c.t.Helper()
	v := c.want.number(c.t, column)
	if math.IsNaN(v) {
		c.t.Fatalf("%s row %d: the reference has no %s", c.series, c.row, column)
	}
	return v
}

func (c *figureCheck) near(column string, want, off float64) {
	c.t.Helper()
	if got := c.got.number(c.t, column); !(math.Abs(got-want) <= off) {
		c.t.Errorf("%s row %d range %s: %s is %v, want %v within %.2g, off by %.2g", c.series, c.row, c.got["range"], column, got, want, off, got-want)
	}
}

func (c *figureCheck) is(column, ref string, off float64) {
	c.t.Helper()
	c.near(column, c.ref(ref), off)
}

// tail compares a tail and its logarithm. A tail's relative change with z is its hazard, at most |z| + 1 for the normal and less for
// the t; R's figures are right to 4.3e-14 relative.
func (c *figureCheck) tail(p, log10 string, zOff, z float64) {
	c.t.Helper()
	rel := zOff*(math.Abs(z)+1) + 1e-13
	c.is("tail", p, rel*c.ref(p))
	c.is("log10_tail", log10, rel/math.Ln10+1e-15*math.Abs(c.ref(log10)))
}

// Counts over all scored rows must be equal: no statistic lies within 4e-5 of a threshold (METHODS.md). Where a line can be
// configured at the threshold, the verdicts are counted, else the printed z or tail.
func testReferenceCounts(t *testing.T, history map[string]map[string][]record) {
	for _, want := range reference(t, "ref/counts.csv") {
		series := want["series"]
		rows := history[series]
		check := func(column string, got int) {
			t.Helper()
			if fmt.Sprint(got) != want[column] {
				t.Errorf("%s: %s is %d, the reference counts %s", series, column, got, want[column])
			}
		}
		verdicts := func(name string, findings ...string) (n int) {
			for _, r := range rows[name][250:] {
				for _, f := range findings {
					if r["verdict"] == f {
						n++
					}
				}
			}
			return n
		}
		counted := func(name, column string, past func(float64) bool) (n int) {
			for _, r := range rows[name][250:] {
				if past(r.number(t, column)) {
					n++
				}
			}
			return n
		}
		beyond := func(line float64) func(float64) bool { return func(z float64) bool { return math.Abs(z) > line } }
		check("T", len(rows["normal"])-250)
		check("z_gt_1.96", verdicts("normal", "watch", "breach"))
		check("z_gt_1.96", counted("normal", "z", beyond(1.96)))
		check("z_gt_2.576", verdicts("far", "watch", "breach"))
		check("z_gt_3", verdicts("normal", "breach"))
		check("z_gt_4.5", verdicts("far", "breach"))
		check("z_lt_m2.3263", verdicts("below", "breach"))
		check("t_pred_1pct", verdicts("predictive", "breach"))
		check("ewmaB_gt_2.576", verdicts("weighted", "breach"))
		check("modz_gt_3.5", counted("mad", "z", beyond(3.5/(0.6745*1.4826))))
		check("emp_2_le_0.01", verdicts("rank", "breach"))
		check("emp_2_le_0.01", counted("rank", "tail", func(p float64) bool { return p <= 0.01 }))
		last := rows["below"][len(rows["below"])-250:]
		n := 0
		for _, r := range last {
			if r["verdict"] == "breach" {
				n++
			}
		}
		check("last250_lower1pct", n)
	}
}
