package main

import (
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// demoFolder is the invented book of the demo, at its end.
func demoFolder(t *testing.T) *folder {
	t.Helper()
	t.Chdir(t.TempDir())
	f := &folder{t, "strayd-demo"}
	if code := run(t.Context(), []string{"demo"}, new(strings.Builder), new(strings.Builder)); code != exitDone {
		t.Fatalf("the demo exits with %d", code)
	}
	return f
}

// nextDay writes the file of Monday 2026-03-16: the values of the Monday before times something.
func (f *folder) nextDay(name string, times float64) {
	f.t.Helper()
	text, err := os.ReadFile(filepath.Join(f.path, "inbox/returns-2026-03-09.csv"))
	if err != nil {
		f.t.Fatal(err)
	}
	lines := strings.Split(strings.TrimSpace(string(text)), "\n")
	for i, line := range lines[1:] {
		cells := strings.Split(line, ",")
		v, err := strconv.ParseFloat(cells[2], 64)
		if err != nil {
			f.t.Fatal(err)
		}
		lines[i+1] = fmt.Sprintf("2026-03-16,%s,%.4f", cells[1], v*times)
	}
	f.write("inbox/"+name, strings.Join(lines, "\n")+"\n")
}

// A file a hundred times too large is refused, and taken when somebody says that it is right; the release is entered with it.
func TestAcceptReleasesAFile(t *testing.T) {
	f := demoFolder(t)
	const now = "2026-03-16T18:30:00Z"
	f.nextDay("returns-2026-03-16.csv", 100)
	if code, out, errs := f.try("pass", "--settled", "--now", now); code != exitFailed || !strings.Contains(errs, "refused") {
		t.Fatalf("exit %d\n%s%s", code, out, errs)
	}
	const file = "returns-2026-03-16.csv"
	for _, c := range []struct {
		args []string
		code int
		want string
	}{
		{[]string{"accept", file}, exitUsage, "accept needs --note"},
		{[]string{"accept", "other.csv", "--note", "x"}, exitFailed, "no file other.csv was ever read"},
		{[]string{"accept", "elsewhere/" + file, "--note", "x"}, exitUsage, "is a file of no feed"},
		{[]string{"accept", "returns-2026-03-09.csv", "--note", "x"}, exitFailed, "was taken: nothing is left to release"},
		{[]string{"accept", file, "--note", "they did"}, exitDone, ""},
		{[]string{"accept", file, "--note", "again"}, exitFailed, "was taken"},
	} {
		code, out, errs := f.try(append(c.args, "--now", now)...)
		if code != c.code || !strings.Contains(errs, c.want) {
			t.Errorf("%v: exit %d, want %d and %q\n%s%s", c.args, code, c.code, c.want, out, errs)
		}
	}
	if n := len(f.list("history", "cedar-growth", "--from", "2026-03-16")); n == 0 {
		t.Error("nothing of the released file is held")
	}
	released := f.list("flags", "--all", "--kind", "refused", "--date", "2026-03-16")
	if len(released) != 1 || released[0]["standing"] != "decided" || !strings.HasSuffix(released[0]["note"], "they did") {
		t.Errorf("its flag is %v", released)
	}
	if e := f.lastEntry(); e.File != file || e.Feed != "administrator" || !regexp.MustCompile(`^[0-9a-f]{64}$`).MatchString(e.SHA256) || e.Note != "they did" {
		t.Errorf("the record says %+v", e)
	}
	if out := f.must("explain", released[0]["ref"]); !strings.Contains(out, "(released; they did)") {
		t.Errorf("explain says\n%s", out)
	}
	f.must("ledger", "verify")
}

// Neither a broken form nor another content is released, and nothing is entered.
func TestAcceptKeepsToTheForm(t *testing.T) {
	f := demoFolder(t)
	const now = "2026-03-16T18:30:00Z"
	f.write("inbox/broken.csv", "date,series,return\n2026-03-16,cedar-growth\n")
	f.nextDay("large.csv", 100)
	if code, _, _ := f.try("pass", "--settled", "--now", now); code != exitFailed {
		t.Fatalf("exit %d", code)
	}
	before := f.must("ledger", "verify")
	if code, _, errs := f.try("accept", "broken.csv", "--note", "x", "--now", now); code != exitFailed || !strings.Contains(errs, "its form is checked as ever") {
		t.Errorf("exit %d, %s", code, errs)
	}
	f.nextDay("large.csv", 101)
	if code, _, errs := f.try("accept", "large.csv", "--note", "x", "--now", now); code != exitFailed || !strings.Contains(errs, "not the one that was refused") {
		t.Errorf("exit %d, %s", code, errs)
	}
	if err := os.Remove(filepath.Join(f.path, "inbox/large.csv")); err != nil {
		t.Fatal(err)
	}
	if code, _, errs := f.try("accept", "large.csv", "--note", "x", "--now", now); code != exitFailed || !strings.Contains(errs, "it is not in the feed's folder") {
		t.Errorf("exit %d, %s", code, errs)
	}
	if after := f.must("ledger", "verify"); after != before {
		t.Errorf("the ledger was\n%s and is\n%s", before, after)
	}
}
