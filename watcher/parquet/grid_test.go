package parquet

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"strings"
	"testing"

	pq "github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/deprecated"

	"strayd/rules"
	"strayd/watcher"
)

var bounds = watcher.GridBounds{Bytes: 8 << 30, Ratio: 200, Columns: 1024}

// spelled is every cell of a table, or why it is refused.
func spelled(content []byte) string {
	g, err := Open(bytes.NewReader(content), int64(len(content)), "", bounds)
	if err != nil {
		return err.Error()
	}
	defer g.Close() //nolint:errcheck // only read
	var b strings.Builder
	for {
		cells, row, err := g.Next()
		if err == io.EOF {
			return strings.TrimSpace(b.String())
		} else if err != nil {
			return b.String() + err.Error()
		}
		var texts []string
		for _, c := range cells {
			switch {
			case row == 0 && c.Kind == watcher.TextCell:
				texts = append(texts, c.Text)
			case c.Kind == watcher.DateCell:
				texts = append(texts, "date:"+c.Date.String())
			default:
				texts = append(texts, [...]string{"text:", "number:"}[c.Kind]+c.Text)
			}
		}
		fmt.Fprintf(&b, "%d %s\n", row, strings.Join(texts, " "))
	}
}

func written[T any](t testing.TB, rows []T, options ...pq.WriterOption) []byte {
	t.Helper()
	var b bytes.Buffer
	w := pq.NewGenericWriter[T](&b, options...)
	_, err := w.Write(rows)
	if err == nil {
		err = w.Close()
	}
	if err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// every has a column of each type that is read.
type every struct {
	Bool   bool             `parquet:"bool"`
	Small  int32            `parquet:"small"`
	Large  int64            `parquet:"large"`
	Count  uint64           `parquet:"count"`
	Float  float32          `parquet:"float"`
	Double float64          `parquet:"double"`
	Text   string           `parquet:"text"`
	Maybe  *float64         `parquet:"maybe,optional"`
	Day    int32            `parquet:"day,date"`
	Milli  int64            `parquet:"milli,timestamp(millisecond)"`
	Nano   int64            `parquet:"nano,timestamp(nanosecond)"`
	Cents  int64            `parquet:"cents,decimal(2:18)"`
	Wide   [16]byte         `parquet:"wide,decimal(15:38)"`
	Old    deprecated.Int96 `parquet:"old"`
}

// What each type is taken for. Day 20521 is 9 March 2026: 56 years of 365 days, 14 leap days before, then 31 + 28 + 8.
func TestTypes(t *testing.T) {
	half := 0.5
	const day = 20521
	rows := []every{{true, -3, 1 << 60, math.MaxUint64, 0.1, 1e-7, "alder", &half, day, day * 86_400_000, day * 86_400_000_000_000, -12345,
		wide(-5_000_000_000_000), deprecated.Int96{0, 0, day + 2440588}},
		{false, 0, 0, 0, float32(math.Inf(-1)), math.NaN(), "", nil, -1, day*86_400_000 + 3_600_500, 1, 7, wide(0), deprecated.Int96{1, 0, day + 2440588}}}
	want := "0 bool small large count float double text maybe day milli nano cents wide old\n" +
		"1 text:TRUE number:-3 number:1152921504606846976 number:18446744073709551615 number:0.1 number:1e-07 text:alder number:0.5 date:2026-03-09 " +
		"date:2026-03-09 date:2026-03-09 number:-123.45 number:-0.005000000000000 date:2026-03-09\n" +
		"2 text:FALSE number:0 number:0 number:0 text:-Infinity number:NaN text: text: date:1969-12-31 text:2026-03-09T01:00:00.5 " +
		"text:1970-01-01T00:00:00.000000001 number:0.07 number:0.000000000000000 text:2026-03-09T00:00:00.000000001"
	for name, options := range map[string][]pq.WriterOption{"plain": nil, "snappy": {pq.Compression(&pq.Snappy)}, "zstd": {pq.Compression(&pq.Zstd)},
		"gzip, first version": {pq.Compression(&pq.Gzip), pq.DataPageVersion(1)}, "first version": {pq.DataPageVersion(1)}} {
		if got := spelled(written(t, rows, options...)); got != want {
			t.Errorf("%s: got\n%s\nwant\n%s", name, got, want)
		}
	}
}

type flat struct {
	A int64   `parquet:"a"`
	B *string `parquet:"b,optional,dict"`
}

func manyFlat(n int) (rows []flat) {
	for i := range n {
		s := fmt.Sprint("name ", i%7)
		rows = append(rows, flat{A: int64(i)})
		if i%3 > 0 {
			rows[i].B = &s
		}
	}
	return rows
}

func TestRefused(t *testing.T) {
	good := written(t, manyFlat(2000), pq.Compression(&pq.Snappy))
	check := func(what string, content []byte, want string) {
		t.Helper()
		if got := spelled(content); got != want {
			t.Errorf("%s: got %s\nwant %s", what, got, want)
		}
	}
	check("nothing", nil, "the file is too short for a Parquet file, or empty")
	check("text", []byte("date,series,return\n2026"), "this is no Parquet file: it does not begin with PAR1")
	check("half", good[:len(good)/2], "the Parquet file is cut off: it does not end with PAR1")
	check("encrypted", append([]byte("PARE"), good[4:]...), "the Parquet file is encrypted")
	huge := bytes.Clone(good)
	copy(huge[len(huge)-8:], "\xff\xff\xff\x7f")
	check("a description beyond the file", huge, "the Parquet file is damaged: its description of 2147483647 bytes does not fit")
	// A list of 2^31-1 elements, of which none is there: field 2, a list of structs (Thrift compact protocol).
	claim := "\x15\x02\x19\xFC\xFF\xFF\xFF\xFF\x07\x00"
	check("a list without elements", []byte("PAR1"+claim+string([]byte{byte(len(claim)), 0, 0, 0})+"PAR1"),
		"the Parquet file is damaged: its description claims more than it holds")
	check("lists", written(t, []struct {
		A []int64 `parquet:"a"`
	}{{[]int64{1}}}), `column "a" holds lists or records; deliver a flat table`)
	check("brotli", written(t, manyFlat(9), pq.Compression(&pq.Brotli)), `column "a" is packed by BROTLI; deliver it unpacked or by snappy, gzip or zstd`)
	check("times of day", written(t, []struct {
		A int64 `parquet:"a,time(microsecond)"`
	}{{1}}), `column "a" holds values of type TIME(isAdjustedToUTC=true,unit=MICROS), which strayd does not read; leave it out`)
	_, err := Open(bytes.NewReader(good), int64(len(good)), "Sheet1", bounds)
	if err == nil || err.Error() != `a Parquet file has no sheets, and sheet is "Sheet1"` {
		t.Error(err)
	}
	_, err = Open(bytes.NewReader(good), int64(len(good)), "", watcher.GridBounds{Bytes: 1000, Ratio: 200, Columns: 9})
	if err == nil || !strings.Contains(err.Error(), "the file swells to more than 1000 bytes") {
		t.Error(err)
	}
}

// A flipped byte anywhere is either without consequence, or changes a value, or is refused; the program goes on.
func TestFlippedBytes(t *testing.T) {
	good := written(t, manyFlat(50), pq.Compression(&pq.Snappy))
	for i := range good {
		bad := bytes.Clone(good)
		bad[i] ^= 1 << (i % 8)
		spelled(bad)
	}
}

// What is written reads back the same, by the library's own reader under a schema written out by hand as README states it.
func TestExportSchema(t *testing.T) {
	type row struct {
		Date   int32    `parquet:"date,date"`
		Series string   `parquet:"series"`
		Return [16]byte `parquet:"return,decimal(15:38)"`
		Days   int32    `parquet:"days"`
		Status *string  `parquet:"status,optional"`
	}
	var b bytes.Buffer
	w := NewWriter(&b, watcher.Returns)
	values := []int64{0, 1, -1, 12_500_000_000_000, math.MaxInt64, math.MinInt64 + 1}
	for i, v := range values {
		if err := w.Write(rules.Date(20521), []byte("alder"), v, rules.Terms{Days: i, Estimate: i == 1}); err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	rows, err := pq.Read[row](bytes.NewReader(b.Bytes()), int64(b.Len()))
	if err != nil || len(rows) != len(values) {
		t.Fatal(err, len(rows))
	}
	for i, r := range rows {
		low := int64(0)
		for _, x := range r.Return[8:] {
			low = low<<8 | int64(x)
		}
		if low != values[i] || r.Date != 20521 || r.Series != "alder" || r.Days != int32(max(i, 1)) || (r.Status != nil) != (i == 1) {
			t.Errorf("row %d: %+v", i, r)
		}
	}
	f, err := pq.OpenFile(bytes.NewReader(b.Bytes()), int64(b.Len()))
	if err != nil {
		t.Fatal(err)
	}
	if v, ok := f.Lookup("strayd.schema"); !ok || v != "returns 1" {
		t.Errorf("schema %q", v)
	}
	want := "0 date series return days status\n1 date:2026-03-09 text:alder number:0.000000000000000 number:1 text:\n" +
		"2 date:2026-03-09 text:alder number:0.000000000000001 number:1 text:estimate\n"
	if got := spelled(b.Bytes()); !strings.HasPrefix(got, want) || !strings.Contains(got, "number:9223.372036854775807") {
		t.Errorf("got\n%s", got)
	}
}

// FuzzOpen: whatever a file holds, it is read or refused with a reason, in the same way each time, within bounded room.
func FuzzOpen(f *testing.F) {
	f.Add(written(f, manyFlat(20), pq.Compression(&pq.Snappy)))
	f.Add(written(f, manyFlat(20), pq.Compression(&pq.Zstd), pq.DataPageVersion(1)))
	f.Add([]byte("PAR1\x00\x00\x00\x00PAR1"))
	f.Fuzz(func(t *testing.T, content []byte) {
		if one, two := spelled(content), spelled(content); one != two {
			t.Fatalf("first\n%s\nthen\n%s", one, two)
		}
	})
}
