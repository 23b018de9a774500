package main

import (
	"fmt"
	"strings"
	"testing"
)

// A file that stops within a line and lacks most series is refused from the second file on, when only dates of a history tell who is
// expected; one that lacks as many and ends as it should may be the first part of a date.
func TestBrokenOffInAYoungBook(t *testing.T) {
	var series []string
	for i := range 24 {
		series = append(series, fmt.Sprintf("quince-%02d", i))
	}
	part := csvDays(series[:9], 61, 61, nil)
	for _, c := range []struct {
		name, text string
		code       int
		says       string
	}{
		{"within a line", strings.TrimSuffix(part, "\n"), exitFailed, "its last line does not end, as those of the files before did: it breaks off"},
		{"with a whole line", part, exitDone, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			f := newFolder(t, "ranges: [{name: own}]\n")
			f.write("inbox/history.csv", csvDays(series, 0, 59, nil))
			f.write("inbox/returns-60.csv", csvDays(series, 60, 60, nil))
			f.must("pass", "--settled")
			f.write("inbox/returns-61.csv", c.text)
			code, out, errs := f.try("pass", "--settled")
			if code != c.code || !strings.Contains(errs, c.says) {
				t.Errorf("exit %d, want %d and %q\n%s%s", code, c.code, c.says, out, errs)
			}
		})
	}
}
