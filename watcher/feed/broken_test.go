package feed

import (
	"errors"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// with changes the plainest feed for one fixture.
type with func(*rules.Feed)

func plain(*rules.Feed)       {}
func semicolon(f *rules.Feed) { f.Separator, f.Decimal = ';', ',' }
func price(f *rules.Feed)     { f.Value = rules.OfPrice }
func wide(f *rules.Feed)      { f.Layout = rules.Wide }
func status(f *rules.Feed)    { f.Columns.Status = "status" }
func days(f *rules.Feed)      { f.Columns.Days = "days" }
func dates(style string) with {
	return func(f *rules.Feed) { f.DateStyle = style }
}
func noEmpty(f *rules.Feed) { f.Missing = []string{"NA"} }

const (
	badNumber  = `the value is not a number`
	grouped    = `the digits are grouped; deliver them without thousands separators`
	bothSides  = `the value needs a digit on both sides of its decimal mark`
	typoMinus  = `the minus is a typographic one (U+2212 or a dash); deliver an ASCII hyphen-minus`
	notFinite  = `the value is not finite`
	sheetError = `the value is a spreadsheet's error`
	noFit      = `the return does not fit: as a fraction it must lie within +-9223.372036854775807`
	notISO     = `date is not written YYYY-MM-DD`
)

// Every file of testdata/broken with its feed and what it must say; each message was written by hand.
var broken = []struct {
	file string
	with with
	want string // after the file's name
}{
	// numbers in a spelling that is not ours; the value stands at byte 20 of line 3
	{"number-nan", plain, `:3:20: ` + notFinite + `: "NaN"`},
	{"number-inf", plain, `:3:20: ` + notFinite + `: "-Infinity"`},
	{"number-hex", plain, `:3:20: the value is a hexadecimal number; deliver decimals: "0x1p-2"`},
	{"number-underscore", plain, `:3:20: ` + grouped + `: "1_000"`},
	{"number-no-digit-after", plain, `:3:20: ` + bothSides + `: "5."`},
	{"number-no-digit-before", plain, `:3:20: ` + bothSides + `: ".5"`},
	{"number-comma-decimal", plain, `:3:20: the value has ',' where the feed declares decimal: ".": "0,5"`},
	{"number-thousands-comma", plain, `:3:20: the value has a thousands separator; deliver the digits ungrouped: "1,234.5"`},
	{"number-thousands-space", plain, `:3:20: ` + grouped + `: "1 234.5"`},
	{"number-nbsp", plain, `:3:20: ` + grouped + `: "1\u00a0234.5"`},
	{"number-apostrophe", plain, `:3:20: ` + grouped + `: "1'234.5"`},
	{"number-parentheses", plain, `:3:20: the value is in parentheses; deliver a minus sign: "(0.1)"`},
	{"number-percent", plain, `:3:20: the value carries a percent sign; deliver the bare number and declare unit: percent: "1.2%"`},
	{"number-bp", plain, `:3:20: the value carries its unit; deliver the bare number and declare unit: bp: "12bp"`},
	{"number-hash-na", plain, `:3:20: ` + sheetError + `: "#N/A"`},
	{"number-hash-div", plain, `:3:20: ` + sheetError + `: "#DIV/0!"`},
	{"number-typographic-minus", plain, `:3:20: ` + typoMinus + `: "−0.01"`},
	{"number-en-dash", plain, `:3:20: ` + typoMinus + `: "–0.01"`},
	{"number-dash-token", plain, `:3:20: ` + badNumber + `: "—"`},
	{"number-lone-sign", plain, `:3:20: ` + badNumber + `: "-"`},
	{"number-two-signs", plain, `:3:20: ` + badNumber + `: "--1"`},
	{"number-plus-minus", plain, `:3:20: ` + badNumber + `: "+-1"`},
	{"number-exponent-empty", plain, `:3:20: ` + badNumber + `: "1e"`},
	{"number-exponent-point", plain, `:3:20: ` + badNumber + `: "1e2.5"`},
	{"number-exponent-long", plain, `:3:20: ` + badNumber + `: "1e00001"`},
	{"number-two-marks", plain, `:3:20: the value has more than one decimal mark: "1.2.3"`},
	{"number-word", plain, `:3:20: ` + badNumber + `: "n.a."`},
	{"number-currency", plain, `:3:20: ` + badNumber + `: "$1.00"`},
	{"number-empty", noEmpty, `:3:20: the value is empty; if that means no value, "" belongs in the feed's missing tokens`},
	{"number-thousands-point", semicolon, `:3:20: the value has a thousands separator; deliver the digits ungrouped: "1.234,5"`},
	{"number-point-for-comma", semicolon, `:3:20: the value has '.' where the feed declares decimal: ",": "1.5"`},
	// numbers out of range
	{"number-too-large", plain, `:3:20: ` + noFit + `: "9223.4"`},
	{"number-too-large-exponent", plain, `:3:20: ` + noFit + `: "1e5"`},
	{"number-overflow-row", plain, `:3:20: ` + noFit + `: "99999999999999999999"`},
	{"price-zero", price, `:3:20: a price must be above zero: "0"`},
	{"price-negative", price, `:3:20: a price must be above zero: "-4"`},
	{"price-rounds-to-zero", price, `:2:20: a price must be above zero: "1e-11"`},
	{"price-too-large", price, `:2:20: the price does not fit: it must lie below 922,337,203.6854775807: "922337203.7"`},
	// dates
	{"date-slashes", plain, `:3:1: ` + notISO + `: "2024/01/03"`},
	{"date-short", plain, `:3:1: ` + notISO + `: "2024-1-3"`},
	{"date-with-time", plain, `:3:1: ` + notISO + `: "2024-01-03T00:00:00"`},
	{"date-empty", plain, `:3:1: ` + notISO},
	{"date-word", plain, `:3:1: ` + notISO + `: "yesterday"`},
	{"date-letters", plain, `:3:1: ` + notISO + `: "2024-O1-03"`},
	{"date-no-such-day", plain, `:3:1: the calendar has no such day (read as YYYY-MM-DD): "2023-02-29"`},
	{"date-month-13", plain, `:3:1: the calendar has no such day (read as YYYY-MM-DD); with day and month exchanged it is Sat 2024-01-13: does the feed's date style say how the provider writes dates?: "2024-13-01"`},
	{"date-future", plain, `:3:1: date 2024-06-30 lies in the future, after 2024-06-29: "2024-06-30"`},
	{"date-ancient", plain, `:3:1: date 1899-12-31 lies before 1900: "1899-12-31"`},
	{"date-day-month", dates("DD/MM/YYYY"), `:3:1: the calendar has no such day (read as DD/MM/YYYY); with day and month exchanged it is Sat 2024-01-13: does the feed's date style say how the provider writes dates?: "01/13/2024"`},
	{"date-month-name", dates("DD-MMM-YYYY"), `:3:1: date is not written DD-MMM-YYYY: "04-JNR-2024"`},
	{"date-two-digit-year", dates("DDMMYY"), `:3:1: date is not written DDMMYY: "03012024"`},
	{"date-excel-fraction", dates("excel"), `:3:1: date is not a whole serial day (45292 is 2024-01-01): "45293.5"`},
	{"date-excel-60", dates("excel"), `:2:1: serial day 60 stands for 29 February 1900, which never was: "60"`},
	// names
	{"series-empty", plain, `:3:12: the name of the series is empty`},
	{"series-spaces", plain, `:3:15: the name of the series is empty`},
	{"series-control", plain, `:3:12: the name of the series holds the invisible character U+0007: "AL\aDER"`},
	{"series-newline", plain, `:3:12: the name of the series holds the invisible character U+000A: "AL\nDER"`},
	{"series-zero-width", plain, `:3:12: the name of the series holds the invisible character U+200B: "ALDER\u200b-2"`},
	{"series-nbsp", plain, `:3:12: a space that is not ASCII stands before or after the name of the series: "ALDER-2\u00a0"`},
	{"series-long", plain, `:3:12: the name of the series is longer than 256 bytes, the limit: "` + strings.Repeat("A", 60) + `"...`},
	// the shape of lines
	{"short-row", plain, `:3: the line has 2 cells, the header has 3`},
	{"long-row", plain, `:3: the line has 4 cells, the header has 3`},
	{"semicolons", plain, `:3: the line has 1 cells, the header has 3`},
	{"decimal-comma-splits", plain, `:3: the line has 4 cells, the header has 3`},
	{"only-separators", plain, `:3:1: ` + notISO},
	{"truncated-row", plain, `:3: the line has 2 cells, the header has 3`},
	{"empty", plain, `: the file is empty`},
	{"blank-lines", plain, `: the file is empty`},
	// headers
	{"no-header", plain, `:1: the header has no column "date"; it has: "2024-01-02, ALDER-1, 0.0123"`},
	{"header-capitals", plain, `:1: the header has no column "date" but has "Date": capitals count`},
	{"header-missing", plain, `:1: the header has no column "return"; it has: "date, series, ret"`},
	{"header-twice", plain, `:1:20: the header has this column twice: "return"`},
	{"header-separator", plain, `:1:1: the header has no ',' but has ';'; is the feed's separator right?: "date;series;return"`},
	{"header-sep-line", plain, `:1:1: the file begins with a spreadsheet's separator line, not with the header; ` +
		`deliver it without, and declare the separator in the feed: "sep="`},
	{"header-mark-inside", plain, `:1: the header has no column "date"; it has: "\ufeffdate, series, return"`},
	{"header-days-missing", days, `:1: the header has no column "days"; it has: "date, series, return"`},
	{"status-unknown", status, `:3:25: the status is neither estimate nor final: "Final"`},
	{"days-zero", days, `:3:25: the number of days is not a whole number from 1 to 366: "0"`},
	{"days-fraction", days, `:2:25: the number of days is not a whole number from 1 to 366: "1.5"`},
	// quotes
	{"quote-inside", plain, `:3:12: ` + quoteInside + `: "AL"`},
	{"quote-after", plain, `:3:12: ` + quoteAfter + `: "ALDER"`},
	{"quote-single-inside", plain, `:3:12: ` + quoteAfter + `: "AL"`},
	{"quote-open", plain, `:3:12: ` + quoteOpen + `: "ALDER,0.01\n2024-01-04,ALDER-1,0.02"`},
	// bytes
	{"nul", plain, `:3:12: the cell holds a NUL byte; a UTF-16 file needs encoding: utf-16: "AL\x00DER"`},
	{"not-utf8", plain, `:3:12: the cell is not valid UTF-8; is the feed's encoding right?: "M\xfcnchen"`},
	{"other-column-not-utf8", plain, `:2:25: the cell is not valid UTF-8; is the feed's encoding right?: "gr\xfcn"`},
	{"carriage-returns", plain, `:1:13: ` + carriageReturn + `: "return\r2024-01-02"`},
	{"carriage-return-inside", plain, `:3: the line has 5 cells, the header has 3`},
	// the same series and date twice
	{"repeat-differs", plain, `:4:20: series "ALDER-1" has another value for 2024-01-02 on line 2 of this file: "0.0124"`},
	{"repeat-differs-far", plain, `:6:23: series "ALDER-1" has another value for 2024-01-03 on line 3 of this file: "-0.01"`},
	// wide files
	{"wide-short-row", wide, `:3: the line has 2 cells, the header has 3`},
	{"wide-long-row", wide, `:2: the line has 4 cells, the header has 3`},
	{"wide-bad-cell", wide, `:3:13: ` + badNumber + `: "x"`},
	{"wide-no-date", wide, `:1: the header has no column "date"; it has: "day, ALDER-1, BIRCH"`},
	{"wide-name-twice", wide, `:1:20: the header has this column twice: "ALDER-1"`},
	{"wide-name-empty", wide, `:1:14: a column of the header has no name`},
	{"wide-repeat-differs", wide, `:3:17: series "BIRCH" has another value for 2024-01-02 on line 2 of this file: "0.03"`},
	{"wide-date-last", wide, `:3:11: ` + notISO + `: "2024-1-3"`},
	{"wide-quote", wide, `:2:17: ` + quoteOpen + `: "0.02\n2024-01-03,0.01,0.02"`},
}

func TestBroken(t *testing.T) {
	var seen []string
	for _, b := range broken {
		name := b.file + ".csv"
		seen = append(seen, name)
		f := longFeed()
		b.with(&f)
		text, err := os.ReadFile(filepath.Join("testdata", "broken", name))
		if err != nil {
			t.Fatal(err)
		}
		for _, o := range []Options{{Workers: 1}, {Workers: 3, chunk: 1}} {
			_, err = read(t, f, name, string(text), o)
			var bad *watcher.BadFile
			if !errors.As(err, &bad) {
				t.Errorf("%s: not refused: %v", name, err)
			} else if bad.Error() != name+b.want {
				t.Errorf("workers %d\n got %s\nwant %s", o.Workers, bad.Error(), name+b.want)
			} else if !knows(bad, f, text) {
				t.Errorf("%s: the refusal does not know its file: %+v", name, bad.File)
			}
		}
	}
	checkAllListed(t, seen)
}

// knows says whether a refusal carries the file's size and hash, so that the file is known again.
func knows(bad *watcher.BadFile, f rules.Feed, text []byte) bool {
	return bad.File.Feed == f.Name && bad.File.Size == int64(len(text)) && bad.File.SHA256 == sum(text)
}

// checkAllListed wants an expectation for every file of the folder.
func checkAllListed(t *testing.T, seen []string) {
	t.Helper()
	entries, err := os.ReadDir(filepath.Join("testdata", "broken"))
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if !slices.Contains(seen, e.Name()) {
			t.Errorf("testdata/broken/%s has no expectation", e.Name())
		}
	}
}
