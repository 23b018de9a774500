package config

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

// Each value in the file and the value it must become; the right-hand sides are written by hand.
func TestValues(t *testing.T) {
	feed := func(line string) rules.Feed {
		return parsed(t, strings.Replace(base, "ranges:", "    "+line+"\nranges:", 1)).Feeds[0]
	}
	own := func(line string) rules.Range { return minimal(t, "    "+line+"\n").Ranges[0] }
	check := func(what string, got, want any) {
		t.Helper()
		if fmt.Sprint(got) != fmt.Sprint(want) {
			t.Errorf("%s: %v, want %v", what, got, want)
		}
	}
	// shares: the same decimal in any unit is the same float
	check("percent", own("breach: {tail: 0.27%}").Breach.Tail == 0.0027, true)
	check("percent, spaced", own("breach: {tail: 0.27 %}").Breach.Tail == 0.0027, true)
	check("bp", own("breach: {tail: 27bp}").Breach.Tail == 0.0027, true)
	check("fraction", own("breach: {tail: 0.0027}").Breach.Tail == 0.0027, true)
	check("quoted percent", own(`breach: {confidence: "99.73%"}`).Breach.Confidence == 0.9973, true)
	check("doubtful", minimal(t, "doubtful: 0.35%\n").Doubtful == 0.0035, true)
	// exact returns
	check("limit", *own("limit: [-50%, 0.1]").Limit, rules.Limit{Low: -500_000_000_000_000, High: 100_000_000_000_000})
	check("limit bp", *own("limit: [-12.5bp, 1e-3]").Limit, rules.Limit{Low: -1_250_000_000_000, High: 1_000_000_000_000})
	check("budget", own("breach: {budget: 2 a week}").Breach.Budget, 2.0)
	check("z", own("watch: {z: 2}\n    breach: {z: 3}").Breach.Z, 3.0)
	// tails
	check("t", own("tail: {t: 3.5}").Tail, rules.TailModel{Name: "t", DF: 3.5})
	check("t5", own("tail: t5").Tail, rules.TailModel{Name: "t", DF: 5})
	check("normal", own("tail: normal").Tail, rules.TailModel{Name: "normal"})
	// times
	check("settle", feed("settle: 1h30m").Settle, 90*time.Minute)
	check("no settling", feed("settle: 0s").Settle, time.Duration(0))
	check("due", *feed("due: {at: 19:30, days: 2}").Due, rules.Due{Minutes: 1170, Days: 2, Timezone: "UTC"})
	// files
	check("folder", feed("").Dir+" "+feed("").Pattern, "/desk/in *.csv")
	here := strings.Replace(base, "in/*.csv", "returns.csv", 1)
	check("here", parsed(t, here).Feeds[0].Dir, "/desk")
	check("above", parsed(t, strings.Replace(base, "in/*.csv", "../x/r.csv", 1)).Feeds[0].Dir, "/x")
	check("absolute", parsed(t, strings.Replace(base, "in/*.csv", "/data/in/r?.csv", 1)).Feeds[0].Dir, "/data/in")
	// feeds
	check("tab", feed(`separator: "\t"`).Separator, feed("separator: tab").Separator)
	check("price column", feed("value: price").Columns.Value, "price")
	check("price unit", feed("value: price\n    unit: percent").Unit, "fraction")
	check("wide columns", feed("layout: wide\n    columns: {date: Day}").Columns, rules.Columns{Date: "Day"})
	check("skip", feed("bad_rows: {skip: 1%}").SkipShare, 0.01)
	check("refuse", feed("bad_rows: refuse").SkipShare, 0.0)
	check("register's groups", parsed(t, base+"channels:\n  - {name: c, console: {}, hours: 22:00-24:00}\n").Channels[0].To, 1440)
	for _, style := range []string{"YYYYMMDD", "DD.MM.YYYY", "MM/DD/YY", "DD-MMM-YYYY", "YYYY MM DD", "excel"} {
		check(style, feed("date: "+style).DateStyle, style)
	}
}

// A watch line that is left out never stands outside the breach line.
func TestWatchLeftOut(t *testing.T) {
	tests := []struct {
		breach string
		want   rules.Line
	}{
		{"{tail: 0.1%}", rules.Line{Tail: 0.01}},
		{"{tail: 5%}", rules.Line{Tail: 0.05}},
		{"{z: 3}", rules.Line{Z: 3}},      // t5: once in 85 days (PRACTICE.md 3.3), so nearer than the watch line's 1 in 100
		{"{z: 4}", rules.Line{Tail: .01}}, // once in 280 days
		{"{budget: 2 a week}", rules.Line{Tail: 0.01}},
	}
	for _, tt := range tests {
		if got := minimal(t, "    breach: "+tt.breach+"\n").Ranges[0].Watch; got != tt.want {
			t.Errorf("breach %s: watch %+v, want %+v", tt.breach, got, tt.want)
		}
	}
}

func TestWhatEncodingAllows(t *testing.T) {
	for _, text := range []string{"\ufeff" + base, strings.ReplaceAll(base, "\n", "\r\n"), strings.ReplaceAll(base, "\n", "\r"),
		"---\n" + base, base + "...\n", base + "# fin"} {
		if _, err := Parse("x.yaml", []byte(text), testOptions); err != nil {
			t.Errorf("%.20q: %v", text, err)
		}
	}
}

func TestLoadRefusesWhatIsNoConfiguration(t *testing.T) {
	dir := t.TempDir()
	if _, err := Load(filepath.Join(dir, "none.yaml"), Options{}); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("a missing file: %v", err)
	}
	if _, err := Load(dir, Options{}); err == nil {
		t.Error("a folder is taken")
	}
	big := filepath.Join(dir, "big.yaml")
	if err := os.WriteFile(big, []byte(base+strings.Repeat("#", 1<<20)), 0o600); err != nil {
		t.Fatal(err)
	}
	_, err := Load(big, Options{})
	if want := big + ":1:1: the file is too large (got more than 1 MiB; expected 1 MiB or less)"; err == nil || err.Error() != want {
		t.Errorf("%v, want %s", err, want)
	}
}

// Nearest words, by hand: within a third of the word's letters, swaps of neighbours counted once.
func TestNearest(t *testing.T) {
	list := []string{"unit", "date", "separator", "four_eyes"}
	tests := []struct{ word, want string }{
		{"unti", "unit"}, {"Unit", "unit"}, {"units", "unit"}, {"seperator", "separator"}, {"four-eyes", "four_eyes"},
		{"dat", "date"}, {"name", ""}, {"", ""}, {"x", ""}, {strings.Repeat("unit", 100), ""},
	}
	for _, tt := range tests {
		if got := nearest(tt.word, list); got != tt.want {
			t.Errorf("nearest(%q) = %q, want %q", tt.word, got, tt.want)
		}
	}
}

func TestRoundUp(t *testing.T) {
	for _, v := range []float64{2.0 / 61, 1.0 / 61, 2.0 / 201, 2.0 / 32769, 1.0 / 6, 0.5} {
		if up := roundUp(v); up < v || up > v*1.001 || math.IsNaN(up) {
			t.Errorf("roundUp(%v) = %v", v, up)
		}
	}
}
