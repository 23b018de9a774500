package stats_test

import (
	"encoding/csv"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"testing"
)

// row is one row of a reference file by column name.
type row map[string]string

// reference reads testdata/reference/name. Each folder there says where its figures come from.
func reference(t testing.TB, name string) []row {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "testdata", "reference", filepath.FromSlash(name)))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	all, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(all) < 2 {
		t.Fatalf("%s has no rows", name)
	}
	var rows []row
	for _, rec := range all[1:] {
		m := row{}
		for i, v := range rec {
			m[all[0][i]] = v
		}
		rows = append(rows, m)
	}
	return rows
}

// float reads a column; text beyond the floats gives 0 or infinity, as strconv rounds it.
func (r row) float(t testing.TB, column string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(r[column], 64)
	if err != nil && !math.IsInf(v, 0) {
		t.Fatalf("column %s: %v", column, err)
	}
	return v
}

func (r row) int(t testing.TB, column string) int {
	t.Helper()
	v, err := strconv.Atoi(r[column])
	if err != nil {
		t.Fatalf("column %s: %v", column, err)
	}
	return v
}

// relative is |got-want|/|want|; 0 when both are 0.
func relative(got, want float64) float64 {
	if got == want {
		return 0
	}
	return math.Abs(got-want) / math.Abs(want)
}

// near fails unless got is within a relative tolerance of want. A NaN fails.
func near(t testing.TB, what string, got, want, tolerance float64) {
	t.Helper()
	if r := relative(got, want); !(r <= tolerance) {
		t.Errorf("%s: got %.17g, want %.17g: off by %.2g of it, allowed %.2g", what, got, want, r, tolerance)
	}
}

// example is one published worked example of worked/worked_examples.json: its parts by name.
type example map[string]json.RawMessage

func worked(t testing.TB, id string) example {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "testdata", "reference", "worked", "worked_examples.json"))
	if err != nil {
		t.Fatal(err)
	}
	var all []example
	if err := json.Unmarshal(text, &all); err != nil {
		t.Fatal(err)
	}
	for _, e := range all {
		if string(e["id"]) == strconv.Quote(id) {
			return e
		}
	}
	t.Fatalf("no worked example %s", id)
	return nil
}

// into decodes one figure of one part.
func (e example) into(t testing.TB, part, name string, v any) {
	t.Helper()
	var figures map[string]json.RawMessage
	if err := json.Unmarshal(e[part], &figures); err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(figures[name], v); err != nil {
		t.Fatalf("%s %s %s: %v", e["id"], part, name, err)
	}
}

func (e example) float(t testing.TB, part, name string) (v float64) {
	t.Helper()
	e.into(t, part, name, &v)
	return v
}

func (e example) floats(t testing.TB, part, name string) (v []float64) {
	t.Helper()
	e.into(t, part, name, &v)
	if len(v) == 0 {
		t.Fatalf("%s %s %s is empty", e["id"], part, name)
	}
	return v
}

// numbers keeps the text of the figures, so that decimals stay exact.
func (e example) numbers(t testing.TB, part, name string) (v []string) {
	t.Helper()
	var numbers []json.Number
	e.into(t, part, name, &numbers)
	for _, n := range numbers {
		v = append(v, n.String())
	}
	return v
}
