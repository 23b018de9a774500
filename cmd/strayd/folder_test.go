package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// folder is a working folder with a configuration, an inbox and, after init, a ledger.
type folder struct {
	t    testing.TB
	path string
}

// newFolder writes a configuration whose feed takes fractions from inbox/*.csv and whose other keys are given, and makes its ledger.
func newFolder(t testing.TB, rest string) *folder {
	t.Helper()
	f := &folder{t, t.TempDir()}
	if err := os.Mkdir(filepath.Join(f.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	f.configure("feeds:\n  - {name: book, files: inbox/*.csv, unit: fraction}\n" + rest)
	f.must("init")
	return f
}

// configure replaces the configuration, the ledger's path apart.
func (f *folder) configure(text string) {
	f.t.Helper()
	f.write("strayd.yaml", "ledger: ledger.db\n"+text)
}

func (f *folder) write(name, text string) {
	f.t.Helper()
	if err := os.WriteFile(filepath.Join(f.path, name), []byte(text), 0o644); err != nil {
		f.t.Fatal(err)
	}
}

// try runs one command line.
func (f *folder) try(args ...string) (code int, stdout, stderr string) {
	var out, errs bytes.Buffer
	code = run(context.Background(), append([]string{"--config", filepath.Join(f.path, "strayd.yaml")}, args...), &out, &errs)
	return code, out.String(), errs.String()
}

// must runs one command line that must succeed and gives its output.
func (f *folder) must(args ...string) string {
	f.t.Helper()
	code, out, errs := f.try(args...)
	if code != exitDone {
		f.t.Fatalf("strayd %s: exit code %d\n%s%s", strings.Join(args, " "), code, out, errs)
	}
	return out
}

// arrive puts a file into the inbox and runs a pass, which must accept it.
func (f *folder) arrive(name, text string) {
	f.t.Helper()
	f.write(filepath.Join("inbox", name), text)
	f.must("pass", "--settled")
}

// record is one row of a listing by its columns' names.
type record map[string]string

// list runs a command with --format csv and gives its rows.
func (f *folder) list(args ...string) []record {
	f.t.Helper()
	return records(f.t, f.must(append(args, "--format", "csv")...))
}

// records reads CSV text with a header; lines that begin with # are left out.
func records(t testing.TB, text string) (out []record) {
	t.Helper()
	r := csv.NewReader(strings.NewReader(text))
	r.Comment = '#'
	lines, err := r.ReadAll()
	if err != nil || len(lines) == 0 {
		t.Fatalf("%v in %d lines of CSV", err, len(lines))
	}
	for _, line := range lines[1:] {
		row := record{}
		for i, name := range lines[0] {
			row[name] = line[i]
		}
		out = append(out, row)
	}
	return out
}

// number is a figure of a row; NaN where the cell is empty.
func (r record) number(t testing.TB, column string) float64 {
	t.Helper()
	if r[column] == "" {
		return math.NaN()
	}
	v, err := strconv.ParseFloat(r[column], 64)
	if err != nil {
		t.Fatalf("column %s: %v", column, err)
	}
	return v
}

// reference reads a table of the outside values.
func reference(t testing.TB, name string) []record {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("../../testdata/reference", name))
	if err != nil {
		t.Fatal(err)
	}
	return records(t, string(text))
}

// checks runs check with further words and wants its exit code, and texts in what it says.
func (f *folder) checks(code int, args []string, texts ...string) {
	f.t.Helper()
	got, out, errs := f.try(append([]string{"check"}, args...)...)
	if got != code {
		f.t.Errorf("check %v: exit code %d\n%s%s", args, got, out, errs)
	}
	for _, text := range texts {
		if !strings.Contains(out, text) {
			f.t.Errorf("check %v does not say %q\n%s", args, text, out)
		}
	}
}
