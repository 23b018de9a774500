package sample

import (
	"errors"
	"fmt"
	"strings"
	"testing"

	"strayd/rules"
)

// today is the newest day in every test: Friday 13 March 2026.
func today(t testing.TB) rules.Date {
	t.Helper()
	d, err := rules.ParseDate("2026-03-13")
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func look(t testing.TB, texts ...string) (*Finding, error) {
	t.Helper()
	var samples []*Sample
	for i, text := range texts {
		name := fmt.Sprintf("s%d.csv", i+1)
		if first, rest, named := strings.Cut(text, ">\n"); named {
			name, text = first, rest
		}
		s, err := Text(name, strings.NewReader(text))
		if err != nil {
			return nil, err
		}
		samples = append(samples, s)
	}
	return Look(samples, today(t))
}

// What each sample is taken for; the expectations were written by hand.
func TestLook(t *testing.T) {
	const long = "date,series,return\n"
	check := func(what, want string, texts ...string) {
		t.Helper()
		f, err := look(t, texts...)
		if err != nil {
			t.Errorf("%s: %v", what, err)
			return
		}
		d := f.Feed
		got := fmt.Sprintf("%s %s %s/%s/%s %s %s %q %q %s %q", d.Layout, d.Value, d.Columns.Date, d.Columns.Series, d.Columns.Value, d.Unit, d.DateStyle,
			d.Decimal, d.Separator, d.Encoding, d.Missing)
		if got != want {
			t.Errorf("%s: got\n%s\nwant\n%s", what, got, want)
		}
	}
	usual := ` utf-8 ["" "NA" "n/a"]`
	check("plain", `long return date/series/return percent YYYY-MM-DD '.' ','`+usual, long+"2026-03-09,A,0.5\n2026-03-09,B,-0.3\n")
	check("fractions", `long return date/series/return fraction YYYY-MM-DD '.' ','`+usual, long+"2026-03-09,A,0.005\n2026-03-09,B,-0.003\n")
	check("basis points", `long return date/series/return bp YYYY-MM-DD '.' ','`+usual, long+"2026-03-09,A,50\n2026-03-09,B,-31.5\n")
	check("the name says bp", `long return date/series/ret_bps bp YYYY-MM-DD '.' ','`+usual, "date,series,ret_bps\n2026-03-09,A,0.5\n2026-03-09,B,-0.3\n")
	check("wide", `wide return Datum// percent DD.MM.YYYY ',' ';'`+usual, "Datum;Nord;Süd\n13.03.2026;0,51;-0,3\n")
	check("one series", `wide return date// percent YYYY-MM-DD '.' ','`+usual, "date,fund\n2026-03-09,0.5\n2026-03-10,-0.3\n")
	check("date last, names beside ids", `long return as_of/isin/perf percent DD-MMM-YYYY '.' '\t'`+usual,
		"isin\tname\tccy\tperf\tas_of\nX1\tNorth\tUSD\t0.5\t09-Mar-2026\nX2\tSouth\tUSD\t-0.3\t09-Mar-2026\n")
	check("numbers for names", `long return date/account/return percent YYYY-MM-DD '.' ','`+usual,
		"date,account,return\n2026-03-09,1001,0.5\n2026-03-09,1002,-0.3\n2026-03-10,1001,0.5\n2026-03-10,1002,-0.3\n")
	check("prices", `long price date/fund/nav  YYYYMMDD '.' '|'`+usual, "date|fund|nav\n20260309|A|101.5\n20260309|B|99.25\n")
	check("return beside price", `long return date/fund/return percent YYYY-MM-DD '.' ','`+usual,
		"date,fund,nav,return\n2026-03-09,A,101.5,0.5\n2026-03-09,B,99.25,-0.3\n")
	check("serial days", `long return date/series/return percent excel '.' ','`+usual, long+"46090,A,0.5\n46090,B,-0.3\n")
	check("month first", `long return date/series/return percent MM/DD/YYYY '.' ','`+usual, long+"03/12/2026,A,0.5\n03/13/2026,A,-0.3\n")
	check("missing", `long return date/series/return percent YYYY-MM-DD '.' ',' utf-8 ["" "NA" "n/a" "--" "pending"]`,
		long+"2026-03-09,A,0.5\n2026-03-09,B,--\n2026-03-09,C,pending\n2026-03-09,D,-0.3\n2026-03-09,E,0.3\n2026-03-09,F,0.3\n2026-03-09,G,0.3\n")
	check("status and days", `long return date/series/return percent YYYY-MM-DD '.' ','`+usual,
		"date,series,return,days,status\n2026-03-09,A,0.5,1,final\n2026-03-09,B,-0.3,2,estimate\n")
	check("latin-1", `wide return Datum// percent DD.MM.YYYY ',' ';' latin-1 ["" "NA" "n/a"]`, "Datum;Z\xfcrich;Bern\n13.03.2026;0,51;-0,3\n")
	check("control totals", `long return date/series/return percent YYYY-MM-DD '.' ','`+usual, long+"2026-03-09,A,0.5\n2026-03-09,B,-0.3\n#rows 2\n#total 0.2\n")
}

// What a finding says of how dates are written, and whether a person must confirm it.
func TestDatesDecide(t *testing.T) {
	rows := func(dates ...string) string {
		text := "date,series,return\n"
		for i, d := range dates {
			text += fmt.Sprintf("%s,S%d,0.5\n", d, i)
		}
		return text
	}
	check := func(text []string, style string, sure Sureness, confirm bool, why string) {
		t.Helper()
		f, err := look(t, text...)
		if err != nil {
			t.Error(err)
			return
		}
		if r := f.Of("date"); f.Feed.DateStyle != style || r.Sure != sure || r.Confirm != confirm || !strings.Contains(r.Why, why) {
			t.Errorf("%s, %s, confirm %v: %s\nwant %s, %s, %v: %s", f.Feed.DateStyle, r.Sure, r.Confirm, r.Why, style, sure, confirm, why)
		}
	}
	check([]string{rows("03/04/2025", "13/04/2025")}, "DD/MM/YYYY", Sure, false, `line 3, "13/04/2025", decides: as MM/DD/YYYY it would be no date`)
	check([]string{rows("03/04/2025", "04/13/2025")}, "MM/DD/YYYY", Sure, false, `line 3, "04/13/2025", decides: as DD/MM/YYYY it would be no date`)
	check([]string{rows("03/04/2025"), rows("13/04/2025")}, "DD/MM/YYYY", Sure, false, `s2.csv:2, "13/04/2025", decides`)
	// 3 April 2025 is a Thursday, 4 March 2025 a Tuesday: nothing speaks for either.
	check([]string{rows("03/04/2025")}, "DD/MM/YYYY", Guess, true,
		`no line decides between DD/MM/YYYY and MM/DD/YYYY: "03/04/2025" is Thu 2025-04-03 or Tue 2025-03-04`)
	// 1 February 2025 is a Saturday, 2 January 2025 a Thursday.
	check([]string{rows("01/02/2025")}, "MM/DD/YYYY", Likely, true, `as DD/MM/YYYY 1 of 1 dates fall on a weekend, as MM/DD/YYYY 0`)
	check([]string{"day-20250304.csv>\n" + rows("03/04/2025")}, "MM/DD/YYYY", Likely, true, `the file's name says 2025-03-04, as MM/DD/YYYY does`)
	// Read with the month first, the day would lie in December 2026, after the test's today.
	check([]string{rows("12/03/2026")}, "DD/MM/YYYY", Sure, false, `decides: as MM/DD/YYYY it would be Thu 2026-12-03, which is still to come`)
	check([]string{rows("2025-03-04")}, "YYYY-MM-DD", Sure, false, `can be written no other way`)
}

// Why a sample is not read: the place, what stands there, and the cure.
func TestUnreadable(t *testing.T) {
	check := func(text, want string) {
		t.Helper()
		_, err := look(t, text)
		var u *Unreadable
		if !errors.As(err, &u) || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("%q: got %v\nwant %s", text, err, want)
		}
	}
	check("", "s1.csv: the file is empty")
	check(" \n\n", "s1.csv: the file is empty")
	check("date,series,return\n", "s1.csv: a header without rows shows neither dates nor numbers")
	check("2026-03-09,A,0.5\n2026-03-10,A,0.4\n", `s1.csv:1: the first line holds "2026-03-09", which is data`)
	check("Report of March\ndate,series,return\n2026-03-09,A,0.5\n", "s1.csv:1: the first line has 1 cells and the next 3")
	check("sep=;\ndate;series;return\n", "s1.csv:1: the file begins with a spreadsheet's separator line")
	check("one\ntwo\n", "s1.csv:1: no separator (comma, semicolon, tab or bar) parts the lines")
	check("date,series,return\n3/9/2026,A,0.5\n", `s1.csv:2: no column holds dates that strayd reads: day, month and year with leading zeros`)
	check("fund,return\nA,0.5\nB,0.4\n", "s1.csv: no column holds dates that strayd reads")
	check("date,series,return\n2026-03-09,A,0.5%\n", `s1.csv:2: no column holds bare numbers beside the dates; column "return" holds "0.5%"`)
	check("date,a,b\n2026-03-09,x,y\n", "s1.csv:1: no column holds bare numbers beside the dates")
	check("date,ccy,return\n2026-03-09,USD,0.5\n2026-03-09,USD,0.4\n", "s1.csv:1: rows are not told apart by date and one other column")
	check("date,return\n2026-03-09,0.5\n2026-03-09,0.4\n", "s1.csv:1: several rows have the same date, and no column tells them apart")
	check("PK\x03\x04zzz", "s1.csv: this is a spreadsheet or archive, not text")
	check("a\x00b,c\n", "s1.csv: holds NUL bytes")
	check("date,\x80\n", "s1.csv:1: byte 0x80 is neither UTF-8 nor latin-1")
	check("a.gz>\nnot packed", "a.gz: is not gzip")
}

// FuzzLook: whatever is looked at, there is a finding with a remark for each key, or a reason; never a panic, and the same each time.
func FuzzLook(f *testing.F) {
	for _, s := range []string{"date,series,return\n2026-03-09,A,0.5\n", "Datum;A;B\n13.03.2026;0,5;-0,3\n", "a|b\n1|2\n", "\xff\xfea\x00,\x00b\x00\n\x00",
		"date,series,return\n\"03/04/2025\n,A\",x\n", "date,a\n46090,1\n46091,2\n", "d,s,v\n260309,A,1\n"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		one, err := look(t, text)
		two, again := look(t, text)
		if fmt.Sprint(one, err) != fmt.Sprint(two, again) {
			t.Fatalf("%v %v, then %v %v", one, err, two, again)
		}
		var u *Unreadable
		if err != nil && (!errors.As(err, &u) || u.Reason == "") {
			t.Fatalf("no reason: %v", err)
		}
		for _, key := range []string{"layout", "columns", "value", "date", "decimal", "missing", "separator", "encoding"} {
			if err == nil && one.Of(key).Why == "" {
				t.Fatalf("no remark on %s", key)
			}
		}
	})
}
