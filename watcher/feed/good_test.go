package feed

import (
	"bytes"
	"compress/gzip"
	"encoding/binary"
	"strings"
	"testing"
	"unicode/utf16"

	"strayd/rules"
	"strayd/watcher"
)

// Good files: what they hold, worked out by hand from the text.
func TestGood(t *testing.T) {
	const head = "date,series,return\n"
	check := func(what string, with with, text, want string) {
		t.Helper()
		f := longFeed()
		with(&f)
		for _, o := range []Options{{Workers: 1}, {Workers: 3, chunk: 1}} {
			s, err := read(t, f, "good.csv", text, o)
			if err != nil {
				t.Errorf("%s: %v", what, err)
			} else if got := spell(s); got != want {
				t.Errorf("%s: got\n%swant\n%s", what, got, want)
			}
		}
	}
	// line ends, blank lines, byte-order mark
	const two = "2024-01-02 A 0.01 2\n2024-01-03 A -0.02 3\n"
	check("LF", plain, head+"2024-01-02,A,0.01\n2024-01-03,A,-0.02\n", two)
	check("CRLF", plain, "date,series,return\r\n2024-01-02,A,0.01\r\n2024-01-03,A,-0.02\r\n", two)
	check("no last newline", plain, head+"2024-01-02,A,0.01\n2024-01-03,A,-0.02", two)
	check("CRLF cut after CR", plain, "date,series,return\r\n2024-01-02,A,0.01\r\n2024-01-03,A,-0.02\r", two)
	check("byte-order mark", plain, "\ufeff"+head+"2024-01-02,A,0.01\n2024-01-03,A,-0.02\n", two)
	check("blank lines count", plain, "\n \t\n"+head+"\n2024-01-02,A,0.01\n\r\n   \n2024-01-03,A,-0.02\n\n", "2024-01-02 A 0.01 5\n2024-01-03 A -0.02 8\n")
	// separators and decimal marks
	check("semicolon", semicolon, "date;series;return\n2024-01-02;A;0,01\n2024-01-03;A;-0,02\n", two)
	check("tab", func(f *rules.Feed) { f.Separator = '\t' }, "date\tseries\treturn\n2024-01-02\tA\t0.01\n2024-01-03\tA\t-0.02\n", two)
	check("bar", func(f *rules.Feed) { f.Separator = '|' }, "date|series|return\n2024-01-02|A|0.01\n2024-01-03|A|-0.02\n", two)
	check("comma twice", func(f *rules.Feed) { f.Decimal = ',' }, head+"2024-01-02,A,\"0,01\"\n2024-01-03,A,\"-0,02\"\n", two)
	// column order, columns that nobody asked for, spaces, quotes
	check("order", plain, "x,return,note,series,date\n1,0.01,,A,2024-01-02\n2,-0.02,\"a, \"\"b\"\"\nc\",A,2024-01-03\n", two)
	check("spaces", plain, " date , series,return \n 2024-01-02 ,\tA , 0.01\n2024-01-03, A,-0.02  \n", two)
	check("quotes", plain, `"date","series","return"`+"\n"+`"2024-01-02","A","0.01"`+"\n"+` "2024-01-03" , "A" , "-0.02" `+"\n", two)
	check("trailing separators everywhere", plain, "date,series,return,,\n2024-01-02,A,0.01,,\n2024-01-03,A,-0.02,,\n", two)
	check("names", plain, head+"2024-01-02,\"A, B \"\"C\"\"\",1\n2024-01-02,Münch n°1,2\n2024-01-02,A B,3\n",
		"2024-01-02 A, B \"C\" 1 2\n2024-01-02 Münch n°1 2 3\n2024-01-02 A B 3 4\n")
	check("status and days", func(f *rules.Feed) { f.Columns.Status, f.Columns.Days = "st", "d" },
		"date,series,return,st,d\n2024-01-02,A,0.01,final,1\n2024-01-03,A,-0.02,estimate,366\n", two)
	// numbers
	check("spellings", plain, head+"2024-01-02,A,+1\n2024-01-02,B,-0\n2024-01-02,C,007.50\n2024-01-02,D,1.5E-3\n2024-01-02,E,2e+2\n2024-01-02,F,1e-0020\n",
		"2024-01-02 A 1 2\n2024-01-02 B 0 3\n2024-01-02 C 7.5 4\n2024-01-02 D 0.0015 5\n2024-01-02 E 200 6\n2024-01-02 F 0 7\n")
	check("half to even at the fifteenth decimal", plain, head+"2024-01-02,A,0.0000000000000005\n2024-01-02,B,0.0000000000000015\n"+
		"2024-01-02,C,-0.0000000000000025\n2024-01-02,D,0.00000000000000050000001\n2024-01-02,E,123.4567890123456786\n",
		"2024-01-02 A 0 2\n2024-01-02 B 0.000000000000002 3\n2024-01-02 C -0.000000000000002 4\n2024-01-02 D 0.000000000000001 5\n"+
			"2024-01-02 E 123.456789012345679 6\n")
	check("greatest", plain, head+"2024-01-02,A,9223.372036854775807\n2024-01-02,B,-9223.372036854775807\n",
		"2024-01-02 A 9223.372036854775807 2\n2024-01-02 B -9223.372036854775807 3\n")
	check("percent", func(f *rules.Feed) { f.Unit = rules.Percent }, head+"2024-01-02,A,1\n2024-01-03,A,-2.0e0\n", two)
	check("bp", func(f *rules.Feed) { f.Unit = rules.BP }, head+"2024-01-02,A,100.00\n2024-01-03,A,-200\n", two)
	check("price", price, head+"2024-01-02,A,101.25\n2024-01-03,A,0.0000000001\n2024-01-04,A,922337203.6854775807\n",
		"2024-01-02 A 101.25 2\n2024-01-03 A 0.0000000001 3\n2024-01-04 A 922337203.6854775807 4\n")
	// missing
	check("missing", plain, head+"2024-01-02,A,\n2024-01-02,B,NA\n2024-01-02,C,\"n/a\"\n2024-01-02,D, \n2024-01-02,E,1\n", "2024-01-02 E 1 6\n")
	check("missing numbers", func(f *rules.Feed) { f.Missing = []string{"-99.99", "9999"} },
		head+"2024-01-02,A,-99.99\n2024-01-02,B,9999\n2024-01-02,C,99.99\n2024-01-02,D,-99.990\n", "2024-01-02 C 99.99 4\n2024-01-02 D -99.99 5\n")
	check("missing, then there", plain, head+"2024-01-02,A,NA\n2024-01-02,A,1\n", "2024-01-02 A 1 3\n")
	// dates
	for style, text := range map[string]string{"YYYY-MM-DD": "2024-01-02 2024-01-03", "DD/MM/YYYY": "02/01/2024 03/01/2024",
		"MM/DD/YYYY": "01/02/2024 01/03/2024", "YYYYMMDD": "20240102 20240103", "DD-MMM-YYYY": "02-JAN-2024 03-Jan-2024",
		"DD.MM.YY": "02.01.24 03.01.24", "MMM DD YYYY": "jan 02 2024 JAN 03 2024", "excel": "45293 45294",
		"YYYY-MM-DD 00:00:00": "2024-01-02 00:00:00 2024-01-03 00:00:00"} {
		d := [2]string{text[:len(text)/2], text[len(text)/2+1:]}
		check(style, dates(style), head+d[0]+",A,0.01\n"+d[1]+",A,-0.02\n", two)
	}
	check("year of two digits", dates("YYMMDD"), head+"691231,A,1\n230101,A,2\n", "1969-12-31 A 1 2\n2023-01-01 A 2 3\n")
	check("first and last day", plain, head+"1900-01-01,A,1\n2024-06-29,A,2\n", "1900-01-01 A 1 2\n2024-06-29 A 2 3\n")
	check("early serial days", dates("excel"), head+"1,A,1\n59,A,2\n61,A,3\n", "1900-01-01 A 1 2\n1900-02-28 A 2 3\n1900-03-01 A 3 4\n")
	// wide
	check("wide", wide, "date,A,B\n2024-01-02,0.01,\n2024-01-03,NA,\"-0.02\"\n2024-01-04,1,2\n",
		"2024-01-02 A 0.01 2\n2024-01-03 B -0.02 3\n2024-01-04 A 1 4\n2024-01-04 B 2 4\n")
	check("wide, date last", wide, "A,B,date\n1,2,2024-01-02\n,3,2024-01-03\n", "2024-01-02 A 1 2\n2024-01-02 B 2 2\n2024-01-03 B 3 3\n")
	check("wide, date between, CRLF", wide, "A,date,B\r\n1,2024-01-02,2\r\n,2024-01-03,\r\n", "2024-01-02 A 1 2\n2024-01-02 B 2 2\n")
	// any order of rows
	check("any order", plain, head+"2024-01-03,B,4\n2024-01-02,B,2\n2024-01-03,A,3\n2024-01-02,A,1\n2024-01-02,C,9\n",
		"2024-01-02 B 2 3\n2024-01-02 A 1 5\n2024-01-02 C 9 6\n2024-01-03 B 4 2\n2024-01-03 A 3 4\n")
	check("two, the second before the first", plain, head+"2024-01-02,A,1\n2024-01-02,B,2\n2024-01-03,B,4\n2024-01-03,A,3\n",
		"2024-01-02 A 1 2\n2024-01-02 B 2 3\n2024-01-03 A 3 5\n2024-01-03 B 4 4\n")
	check("lines after quoted newlines", plain, "date,series,x,return\n2024-01-02,A,\"a\n\nb\",1\n2024-01-02,B,,2\n", "2024-01-02 A 1 2\n2024-01-02 B 2 5\n")
	check("header only", plain, head, "")
}

func TestCounts(t *testing.T) {
	s, err := read(t, longFeed(), "a.csv", "date,series,return\n2024-01-02,A,0.01\n2024-01-02,A,0.010\n2024-01-02,B,\n2024-01-02,A,1e-2", Options{})
	if err != nil {
		t.Fatal(err)
	}
	if s.Rows != 1 || s.Repeated != 2 || s.Missing != 1 || s.Skipped != 0 || s.Held != 0 || s.Names.Len() != 1 {
		t.Errorf("rows %d, repeated %d, missing %d, skipped %d", s.Rows, s.Repeated, s.Missing, s.Skipped)
	}
	if want := "the last line has no newline: is the file whole?"; len(s.Notes) != 1 || s.Notes[0] != want {
		t.Errorf("notes %q", s.Notes)
	}
}

func TestSkip(t *testing.T) {
	text := "date,series,return\n2024-01-02,A,0.01\n2024-01-02,B,x\n2024-01-02\n2024-01-02,C,0.02\n"
	f := longFeed()
	f.SkipShare = 0.5
	s, err := read(t, f, "a.csv", text, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if got, want := spell(s), "2024-01-02 A 0.01 2\n2024-01-02 C 0.02 5\n"; got != want || s.Skipped != 2 || s.Rows != 2 {
		t.Errorf("got\n%s skipped %d", got, s.Skipped)
	}
	want := []string{`skipped a.csv:3:14: the value is not a number: "x"`, `skipped a.csv:4: the line has 1 cells, the header has 3`}
	if strings.Join(s.Notes, "\n") != strings.Join(want, "\n") {
		t.Errorf("notes %q", s.Notes)
	}
	f.SkipShare = 0.49
	_, err = read(t, f, "a.csv", text, Options{})
	if want := `a.csv:3:14: 2 of 4 rows are bad, more than the share of 0.49 that may be skipped; the first: the value is not a number: "x"`; err == nil ||
		err.Error() != want {
		t.Errorf("got %v", err)
	}
	f.SkipShare = 1
	if _, err = read(t, f, "a.csv", text+"2024-01-02,\"D\"x,1\n", Options{}); err == nil || !strings.Contains(err.Error(), quoteAfter) {
		t.Errorf("a fault of quoting was skipped: %v", err)
	}
	f.Layout = rules.Wide
	s, err = read(t, f, "a.csv", "date,A,B,C\n2024-01-02,1,x,3\n2024-01-03,1,x\n2024-01-04,1,2,3\n", Options{})
	if err != nil || s.Skipped != 1+3 || s.Rows != 2+3 {
		t.Errorf("wide: %v, skipped %d, rows %d", err, s.Skipped, s.Rows)
	}
}

// inUTF16 writes text in UTF-16, with a byte-order mark or without.
func inUTF16(text string, order binary.AppendByteOrder, mark bool) []byte {
	var b []byte
	if mark {
		b = order.AppendUint16(b, 0xFEFF)
	}
	for _, u := range utf16.Encode([]rune(text)) {
		b = order.AppendUint16(b, u)
	}
	return b
}

func packed(t testing.TB, text []byte) []byte {
	t.Helper()
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	if _, err := z.Write(text); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func encoding(name string) with { return func(f *rules.Feed) { f.Encoding = name } }

func TestEncodings(t *testing.T) {
	const text = "date,series,return\n2024-01-02,Zürich 𝔸,0.01\n"
	const want = "2024-01-02 Zürich 𝔸 0.01 2\n"
	little, big := binary.LittleEndian, binary.BigEndian
	half := inUTF16("date,series,return\n2024-01-02,", little, true)
	check := func(what, name string, with with, content []byte, want string) {
		t.Helper()
		f := longFeed()
		with(&f)
		s, err := read(t, f, name, string(content), Options{Workers: 2, chunk: 3})
		got := ""
		if err != nil {
			got = err.Error()
		} else {
			got = spell(s)
		}
		if got != want {
			t.Errorf("%s: got\n%s\nwant\n%s", what, got, want)
		}
	}
	zip := func(b ...[]byte) []byte { return bytes.Join(b, nil) }
	check("little", "a.csv", encoding("utf-16"), inUTF16(text, little, true), want)
	check("big", "a.csv", encoding("utf-16"), inUTF16(text, big, true), want)
	check("little without mark", "a.csv", encoding("utf-16"), inUTF16(text, little, false), want)
	check("big without mark", "a.csv", encoding("utf-16"), inUTF16(text, big, false), want)
	check("latin-1", "a.csv", encoding("latin-1"), []byte("date,series,return\n2024-01-02,Z\xfcrich,0.01\n"), "2024-01-02 Zürich 0.01 2\n")
	check("gzip", "a.csv.gz", plain, packed(t, []byte(text)), want)
	check("gzip in two parts", "a.csv.gz", plain, zip(packed(t, []byte(text[:30])), packed(t, []byte(text[30:]))), want)
	check("gzip of UTF-16", "a.csv.gz", encoding("utf-16"), packed(t, inUTF16(text, little, true)), want)
	// refused
	check("UTF-16 undeclared", "a.csv", plain, inUTF16(text, little, true), "a.csv: the file is UTF-16; declare encoding: utf-16")
	check("UTF-16 undeclared, no mark", "a.csv", plain, inUTF16(text, big, false), "a.csv: the file is UTF-16; declare encoding: utf-16")
	check("not UTF-16", "a.csv", encoding("utf-16"), []byte(text),
		"a.csv: the file is not UTF-16: it has no byte-order mark and does not begin with an ASCII letter")
	check("odd", "a.csv", encoding("utf-16"), inUTF16(text, big, true)[:41], "a.csv: the UTF-16 file is cut off: it has an odd number of bytes")
	check("half a pair", "a.csv", encoding("utf-16"), zip(half, []byte{0x3c, 0xd8}, inUTF16(",1\n", little, false)),
		"a.csv: half of a UTF-16 pair stands alone, before byte 66")
	check("windows-1252", "a.csv", encoding("latin-1"), []byte("date,series,return\n2024-01-02,\x80,0.01\n"),
		"a.csv: byte 31 of the file, 0x80, is no letter of latin-1 (it looks like windows-1252); deliver UTF-8")
	check("latin-1 with mark", "a.csv", encoding("latin-1"), []byte("\ufeff"+text), "a.csv: the file begins with a Unicode byte-order mark; it is not latin-1")
	check("gzip cut off", "a.csv.gz", plain, packed(t, []byte(text))[:40], "a.csv.gz: the compressed file is cut off")
	check("gzip cut in its header", "a.csv.gz", plain, packed(t, []byte(text))[:5], "a.csv.gz: the compressed file is cut off")
	check("gzip of nothing", "a.csv.gz", plain, packed(t, nil), "a.csv.gz: the file is empty")
	check("empty gzip", "a.csv.gz", plain, nil, "a.csv.gz: the file is empty")
	check("not gzip", "a.csv.gz", plain, []byte(text), "a.csv.gz: bytes that are not gzip stand where a compressed part should begin")
	check("gzip with more behind", "a.csv.gz", plain, zip(packed(t, []byte(text)), []byte("garbage that follows")),
		"a.csv.gz: bytes that are not gzip stand where a compressed part should begin")
	sum := packed(t, []byte(text))
	sum[len(sum)-7] ^= 1
	check("gzip checksum", "a.csv.gz", plain, sum, "a.csv.gz: the compressed file is damaged: its checksum does not match")
	bomb := packed(t, append([]byte(text), bytes.Repeat([]byte("\n"), 8<<20)...))
	check("bomb", "a.csv.gz", plain, bomb, "a.csv.gz: the file swells to more than 200 times its compressed size, the limit")
}

func TestLimits(t *testing.T) {
	const text = "date,series,return\n2024-01-02,A,0.01\n2024-01-02,B,0.02\n"
	long := strings.Replace(text, ",B,", ","+strings.Repeat("B", 90)+",", 1)
	check := func(what string, with with, text string, l Limits, want string) {
		t.Helper()
		f := longFeed()
		with(&f)
		for _, chunk := range []int{1, 64, 1 << 20} {
			_, err := read(t, f, "a.csv", text, Options{Limits: l, chunk: chunk})
			if err == nil || err.Error() != want {
				t.Errorf("%s, chunk %d: got %v\nwant %s", what, chunk, err, want)
			}
		}
	}
	check("file", plain, text, Limits{FileBytes: 50}, "a.csv: the file has 55 bytes, more than the limit of 50")
	check("text", plain, text, Limits{TextBytes: 50}, "a.csv: the text is longer than 50 bytes, the limit")
	check("line", plain, long, Limits{LineBytes: 100}, "a.csv:3: the line is longer than 100 bytes, the limit (is a quote left open?)")
	check("line without end", plain, long+strings.Repeat("x", 300), Limits{LineBytes: 150},
		"a.csv:4: the line is longer than 150 bytes, the limit (is a quote left open?)")
	check("open quote", plain, text+`2024-01-02,"C,`+strings.Repeat("1\n", 300)+`",1`, Limits{LineBytes: 100},
		"a.csv:4: the line is longer than 100 bytes, the limit (is a quote left open?)")
	check("header", plain, long, Limits{LineBytes: 18}, "a.csv:1: the line is longer than 18 bytes, the limit (is a quote left open?)")
	check("name", plain, long, Limits{NameBytes: 89}, `a.csv:3:12: the name of the series is longer than 89 bytes, the limit: "`+
		strings.Repeat("B", 60)+`"...`)
	check("cell", plain, strings.Replace(text, "B", `"`+strings.Repeat("B", 90)+`"`, 1), Limits{CellBytes: 80},
		`a.csv:3:12: the cell is longer than 80 bytes, the limit: "`+strings.Repeat("B", 60)+`"...`)
	check("columns", plain, text, Limits{Columns: 2}, "a.csv:1:13: the header has more than 2 columns, the limit")
	check("lines", plain, text, Limits{Lines: 2}, "a.csv: the file has more than 2 lines, the limit")
	check("memory", plain, text, Limits{SheetBytes: 100}, "a.csv: the values of the file need more than 100 bytes of memory, the limit: "+
		"too many series spread over too many dates; split the file")
}

// A refused file leaves the names as they were, and a later file gets the same numbers as if it had never come.
func TestRefusalForgetsNames(t *testing.T) {
	names := watcher.NewNames(nil, nil)
	names.Add([]byte("A"))
	c := lay(t, "a.csv", []byte("date,series,return\n2024-01-02,B,1\n2024-01-02,A,1\n2024-01-02,C,x\n"))
	if _, err := Read(t.Context(), c, longFeed(), names, Options{Now: testNow}); err == nil || names.Len() != 1 {
		t.Fatal(err, names.Len())
	}
	if _, ok := names.Find([]byte("B")); ok {
		t.Error("B is still known")
	}
	c = lay(t, "b.csv", []byte("date,series,return\n2024-01-02,C,1\n2024-01-02,A,1\n"))
	s, err := Read(t.Context(), c, longFeed(), names, Options{Now: testNow})
	if err != nil || s.Held != 1 || names.Len() != 2 || string(names.Name(1)) != "C" {
		t.Error(err, names.Len())
	}
}

// New series between held ones get the next numbers; the held ones keep theirs.
func TestHeldAndNewSeries(t *testing.T) {
	names := watcher.NewNames(nil, nil)
	names.Add([]byte("A"))
	names.Add([]byte("B"))
	text := "date,series,return\n2024-01-02,C,3\n2024-01-02,B,2\n2024-01-02,D,4\n2024-01-02,A,1\n2024-01-03,A,5\n2024-01-03,D,6\n"
	s, err := Read(t.Context(), lay(t, "a.csv", []byte(text)), longFeed(), names, Options{Now: testNow})
	if err != nil {
		t.Fatal(err)
	}
	want := "2024-01-02 A 1 5\n2024-01-02 B 2 3\n2024-01-02 C 3 2\n2024-01-02 D 4 4\n2024-01-03 A 5 6\n2024-01-03 D 6 7\n"
	if got := spell(s); got != want || s.Held != 2 {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}
