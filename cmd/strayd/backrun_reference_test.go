package main

import (
	"fmt"
	"math"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// referenceRules are the rules of testdata/reference/ref/coverage.csv that a range can state, by its name there.
const referenceRules = `doubtful: 0%
ranges:
  - {name: two_sided_99_normal, window: 250, tail: normal, predictive: false, pending: keep, watch: {tail: 2%}, breach: {tail: 1%}}
  - {name: two_sided_95_normal, window: 250, tail: normal, predictive: false, pending: keep, watch: {tail: 6%}, breach: {tail: 5%}}
  - {name: two_sided_99_t_pred, window: 250, tail: predictive-t, pending: keep, watch: {tail: 2%}, breach: {tail: 1%}}
  - {name: lower_1pct_normal, window: 250, tail: normal, predictive: false, pending: keep, side: lower, watch: {tail: 2%}, breach: {tail: 1%}}
`

// From a file of open index returns to the tests of coverage, against R: the counts, Kupiec's probability, that of Christoffersen's test of
// independence, and that of both together (R 4.2.2, which keeps about 11 digits of a ratio; definitions in ref/METHODS.md).
func TestBackRunAgainstR(t *testing.T) {
	f := newFolder(t, referenceRules)
	want := map[string][]record{}
	for _, r := range reference(t, "ref/coverage.csv") {
		if strings.Contains(referenceRules, "name: "+r["rule"]+",") {
			want[r["series"]] = append(want[r["series"]], r)
		}
	}
	compared := 0
	for _, series := range openSeries {
		if len(want[series]) == 0 {
			continue
		}
		rows := reference(t, "data/"+series+".csv")
		dates := openDates(t, rows)
		var text strings.Builder
		text.WriteString("date,series,return\n")
		for i, r := range rows {
			fmt.Fprintf(&text, "%s,%s,%s\n", dates[i], series, r["ret"])
		}
		f.write(series+".csv", text.String())
		got := f.backRun(filepath.Join(f.path, series+".csv"), "--days", want[series][0]["T"])
		for _, r := range want[series] {
			key := "coverage||" + r["rule"] + "|breach "
			got.is(t, key+"beyond", "these", r["x"])
			got.is(t, key+"beyond", "these_of", r["T"])
			for figure, column := range map[string]string{"kupiec p": "p_uc", "christoffersen p": "p_ind", "conditional p": "p_cc"} {
				p, err := strconv.ParseFloat(got[key+figure]["these"], 64)
				if w := r.number(t, column); err != nil || math.Abs(p/w-1) > 1e-8 {
					t.Errorf("%s %s %s: %v, want %v", series, r["rule"], figure, p, w)
				}
				compared++
			}
		}
	}
	if compared < 40 {
		t.Errorf("only %d figures compared", compared)
	}
}
