package main

import (
	"math"
	"testing"
)

// The oracle's own tails and lines against outside values, so that both cannot be wrong in the same way: the grid of 70 digits in
// testdata/reference/grid.
func TestOracleTails(t *testing.T) {
	normal, student := 0, 0
	for _, r := range reference(t, "grid/normal_tail.csv") {
		z := r.number(t, "z")
		if z < 0 || z > 100 {
			continue
		}
		normal++
		nearLog(t, "normal", z, 0, upperTail(z, 0)/math.Ln10, r)
	}
	for _, r := range reference(t, "grid/t_tail.csv") {
		x, df := r.number(t, "t"), r.number(t, "df")
		if x < 0 || df != math.Trunc(df) || df > 60 || df < 3 || x > 1e12 {
			continue
		}
		student++
		nearLog(t, "t", x, int(df), upperTail(x, int(df))/math.Ln10, r)
	}
	if normal < 20 || student < 20 {
		t.Errorf("compared %d normal and %d t tails", normal, student)
	}
}

func nearLog(t *testing.T, name string, x float64, df int, got float64, r record) {
	t.Helper()
	want := r.number(t, "log10_upper")
	if !(math.Abs(got-want) <= 1e-12*math.Max(1, math.Abs(want))) {
		t.Errorf("%s tail of %v, %d degrees of freedom: log10 %v, want %v", name, x, df, got, want)
	}
}
