package calendar

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"strayd/rules"
)

func day(t *testing.T, s string) rules.Date {
	t.Helper()
	d, err := rules.ParseDate(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func parsed(t *testing.T, text, folder string) *rules.Calendar {
	t.Helper()
	c, err := Parse(text, func(name string) string { return filepath.Join(folder, name) })
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// Days read off published lists: the bank holidays of England and Wales (gov.uk), the federal holidays of the United States (opm.gov),
// the closing days of the euro's payment system (ECB), and the public holidays of Bavaria and Berlin.
func TestNationalDays(t *testing.T) {
	tests := []struct{ text, closed, open string }{
		{"GB", "2024-01-01 2024-03-29 2024-04-01 2024-05-06 2024-05-27 2024-08-26 2024-12-25 2024-12-26", "2024-04-02 2024-12-24"},
		{"GB", "2022-06-02 2022-06-03 2023-05-08 2021-12-27 2021-12-28", "2022-05-30"}, // of one year; observed on other days
		{"US", "2024-01-01 2024-01-15 2024-02-19 2024-05-27 2024-06-19 2024-07-04 2024-09-02 2024-10-14 2024-11-11 2024-11-28 2024-12-25", "2024-03-29"},
		{"US", "2021-12-31", "2022-01-03"}, // New Year's Day of 2022 was observed the year before
		{"ECB", "2024-01-01 2024-03-29 2024-04-01 2024-05-01 2024-12-25 2024-12-26", "2024-05-09 2024-10-03"},
		{"DE-BY", "2024-01-06 2024-05-30 2024-10-03 2024-11-01", "2024-10-31"},
		{"DE-BE", "2024-03-08 2024-10-03", "2024-05-30 2024-11-01"},
		{"GB+US", "2024-07-04 2024-08-26", "2024-07-05"},
		{"gb", "2024-03-29", ""},
	}
	for _, tt := range tests {
		c := parsed(t, tt.text, "")
		for _, s := range strings.Fields(tt.closed) {
			if c.Business(day(t, s)) {
				t.Errorf("%s: %s is a business day", tt.text, s)
			}
		}
		for _, s := range strings.Fields(tt.open) {
			if !c.Business(day(t, s)) {
				t.Errorf("%s: %s is none", tt.text, s)
			}
		}
	}
}

// Every list that is offered gives some days in a year and leaves most.
func TestAllNations(t *testing.T) {
	first, last := day(t, "2024-01-01"), day(t, "2024-12-31") // 262 weekdays
	for code := range nations() {
		if n := parsed(t, code, "").Between(first-1, last); n < 240 || n > 258 {
			t.Errorf("%s has %d business days in 2024", code, n)
		}
	}
}

func TestWeeks(t *testing.T) {
	for _, tt := range []struct {
		text string
		want rules.Week
	}{{"weekdays", 0}, {"daily", 0b1111111}, {"sun-thu", 0b0011111}, {"sat-wed", 0b1001111}, {"mon-sat", 0b1111110}, {"weekdays+sun-thu", 0b0011110}} {
		if c := parsed(t, tt.text, ""); c.Week != tt.want {
			t.Errorf("%s is %07b, want %07b", tt.text, c.Week, tt.want)
		}
	}
}

func TestFileOfDays(t *testing.T) {
	folder := t.TempDir()
	write := func(name, text string) {
		if err := os.WriteFile(filepath.Join(folder, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	write("days.csv", "\ufeffdate,day,name\n2026-12-24,,Eve\n2026-05-02,open,a working Saturday\n2024-12-25,open,\"open, once\"\n")
	c := parsed(t, "days.csv+GB", folder)
	for s, want := range map[string]bool{"2026-12-24": false, "2026-05-02": true, "2024-12-25": true, "2025-12-25": false, "2026-12-23": true} {
		if c.Business(day(t, s)) != want {
			t.Errorf("%s: %v", s, !want)
		}
	}
	for name, tt := range map[string]struct{ text, want string }{
		"header":  {"day\n", "no column date"},
		"unknown": {"date,kind\n", `unknown column "kind"`},
		"date":    {"date\n2026-12-24\n24.12.2026\n", "date:3"},
		"word":    {"date,day\n2026-12-24,shut\n", "word:2: day \"shut\" is neither"},
		"ragged":  {"date,day\n2026-12-24\n", "wrong number of fields"},
	} {
		write(name, tt.text)
		if _, err := Parse(name, func(n string) string { return filepath.Join(folder, n) }); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: %v, want %s", name, err, tt.want)
		}
	}
}

func TestTextsThatAreNoCalendar(t *testing.T) {
	for text, want := range map[string]string{
		"XX": "no holidays are known", "mon-mon": "no file", "sat-sun+weekdays": "no business day", "": "empty", "GB+": "empty", "none.csv": "no file that can be read",
	} {
		if _, err := Parse(text, func(n string) string { return filepath.Join(t.TempDir(), n) }); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, want %s", text, err, want)
		}
	}
}
