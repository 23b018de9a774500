package ledger

import (
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// fresh makes a ledger in a folder of its own and closes it at the end.
func fresh(t testing.TB) *Ledger {
	t.Helper()
	l, err := Open(filepath.Join(t.TempDir(), "ledger.db"), Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := l.Close(); err != nil {
			t.Error(err)
		}
	})
	return l
}

func publish(t testing.TB, l *Ledger, b *watcher.Batch) {
	t.Helper()
	if err := l.Publish(b); err != nil {
		t.Fatal(err)
	}
}

func read(t testing.TB, l *Ledger) *View {
	t.Helper()
	v, err := l.Read()
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { v.Close() })
	return v
}

var noon = time.Date(2024, 3, 1, 12, 0, 0, 123456789, time.UTC)

func fileRow(step uint32) watcher.FileRow {
	f := watcher.FileRow{Step: step, FeedKey: "key", Settings: 1, Outcome: watcher.Accepted, Received: noon, First: 100, Last: 200,
		Stamp: "inode 7", Counts: watcher.Counts{Rows: 10, New: 9, Same: 1, Flags: 2}}
	f.File = watcher.File{Feed: "admin", Name: fmt.Sprintf("nav-%d.csv", step), Size: 4711, SHA256: [32]byte{byte(step), 2, 3}}
	return f
}

// column makes an int32 column; 0 stands for a missing cell.
func column(date rules.Date, block uint32, values ...int32) *watcher.Column {
	c := &watcher.Column{Date: date, Block: block, Decimals: 4, V32: values, Lines: watcher.Lines{First: 2, Stride: 3}}
	for i, v := range values {
		if v == 0 {
			values[i] = watcher.Missing32
		}
	}
	return c
}

func names(from, n int) (list [][]byte) {
	for i := range n {
		list = append(list, fmt.Appendf(nil, "series-%d", from+i))
	}
	return list
}

func TestLayersOverlay(t *testing.T) {
	l := fresh(t)
	publish(t, l, &watcher.Batch{Step: 1, File: fileRow(1), NewNames: names(0, 4), Returns: []*watcher.Column{column(10, 0, 5, 0, 7, 8)}})
	publish(t, l, &watcher.Batch{Step: 2, File: fileRow(2), Returns: []*watcher.Column{column(10, 0, 0, 6), column(-3, 0, 1)}})
	wide := &watcher.Column{Date: 10, Decimals: 15, V64: []int64{watcher.Missing64, watcher.Missing64, watcher.Missing64, 9},
		Lines: watcher.Lines{At: []uint32{0, 0, 0, 77}}}
	publish(t, l, &watcher.Batch{Step: 3, File: fileRow(3), Returns: []*watcher.Column{wide}})
	v := read(t, l)
	const unit = 1e11 // 4 decimals in units of 1e-15
	dst := make([]int64, 5)
	if held, err := v.Fill(watcher.Returns, 10, 0, 0, dst); !held || err != nil {
		t.Fatal(held, err)
	}
	if want := []int64{5 * unit, 6 * unit, 7 * unit, 9, watcher.Missing64}; !reflect.DeepEqual(dst, want) {
		t.Errorf("got %v, want %v", dst, want)
	}
	if held, err := v.Fill(watcher.Returns, 11, 0, 0, dst); held || err != nil {
		t.Fatal(held, err)
	}
	dates, err := v.Dates(watcher.Returns)
	if want := []rules.Date{-3, 10}; err != nil || !reflect.DeepEqual(dates, want) {
		t.Error(dates, err)
	}
	list, err := v.Series(watcher.Returns, 3)
	want := []watcher.Version{{Date: 10, Step: 1, Value: 8 * unit, Line: 8}, {Date: 10, Step: 3, Value: 9, Line: 77}}
	if err != nil || !reflect.DeepEqual(list, want) {
		t.Error(list, err)
	}
}

// TestColumnsComeBack stores random columns of every shape and compares each cell and line with the column's own methods.
func TestColumnsComeBack(t *testing.T) {
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	rng := rand.New(rand.NewPCG(seed, 1))
	for range 300 {
		c := randomColumn(rng)
		l, why := parseLayer(appendColumn(nil, c))
		if why != "" {
			t.Fatal(why)
		}
		from := rng.IntN(c.Len() + 3)
		got := make([]int64, rng.IntN(c.Len()+5))
		want := make([]int64, len(got))
		l.write(got, from, int64(rules.Pow10(rules.Places-l.decimals)))
		c.Fill(want, from, rules.Places)
		if !reflect.DeepEqual(got, want) {
			t.Fatalf("cells differ from %d on: %v, want %v", from, got, want)
		}
		for i := range c.Len() + 2 {
			v, rank, ok := l.find(i)
			if ok && (c.V32 != nil && v != int64(c.V32[i]) || c.V64 != nil && v != c.V64[i]) {
				t.Fatalf("offset %d: %d is not its value", i, v)
			}
			line := c.Line(i)
			if ok != (i < c.Len() && has(c, i)) || ok && l.line(rank) != line {
				t.Fatalf("offset %d: line %d, want %d", i, l.line(rank), line)
			}
		}
	}
}

func randomColumn(rng *rand.Rand) *watcher.Column {
	n := 1 + rng.IntN(200)
	if rng.IntN(20) == 0 {
		n = watcher.BlockSize
	}
	c := &watcher.Column{Decimals: uint8(rng.IntN(9)), Lines: watcher.Lines{First: rng.Uint32N(1e6), Stride: rng.Uint32N(1000)}}
	holes := []float64{0, 0.1, 0.9}[rng.IntN(3)]
	wide := rng.IntN(2) == 0
	for i := range n {
		v := int64(rng.Int32N(1e6)) - 5e5
		if rng.IntN(60) == 0 { // at and beyond the ends of a short cell
			v = []int64{-1 << 23, -1<<23 + 1, -1<<23 + 2, 1<<23 - 1, 1 << 23, 1<<31 - 1, -1<<31 + 1}[rng.IntN(7)]
		}
		gone := rng.Float64() < holes && i < n-1
		switch {
		case wide && gone:
			c.V64 = append(c.V64, watcher.Missing64)
		case wide:
			c.V64 = append(c.V64, v)
		case gone:
			c.V32 = append(c.V32, watcher.Missing32)
		default:
			c.V32 = append(c.V32, int32(v))
		}
	}
	if kind := rng.IntN(4); kind > 0 {
		c.Lines.At = randomLines(rng, c, kind)
	}
	return c
}

// randomLines gives lines in disorder (1), ascending by uneven steps (2), or all the same (3).
func randomLines(rng *rand.Rand, c *watcher.Column, kind int) []uint32 {
	at := make([]uint32, c.Len())
	line := 1 + rng.Uint32N(1e6)
	for i := range at {
		if !has(c, i) {
			continue
		}
		switch kind {
		case 1:
			line = 1 + rng.Uint32()>>rng.IntN(20)
		case 2:
			line += 5000 + rng.Uint32N(1<<rng.IntN(10))
		}
		at[i] = line
	}
	return at
}

// TestFullColumnFillsPages: two full columns of int32 cells too large for short ones must fill eight pages of 4 KiB with their keys,
// where bbolt takes 16 bytes for a page's header and 16 for each element.
func TestFullColumnFillsPages(t *testing.T) {
	c := &watcher.Column{V32: slices.Repeat([]int32{1 << 30}, watcher.BlockSize), Lines: watcher.Lines{First: 1, Stride: 1}}
	value := sealSize + len(appendColumn(nil, c))
	if size := 16 + 2*(16+12+value); size > 8*4096 {
		t.Errorf("two full columns take %d bytes, %d too many", size, size-8*4096)
	}
}

func TestRowsComeBack(t *testing.T) {
	l := fresh(t)
	b := &watcher.Batch{Step: 1, File: fileRow(1), NewNames: names(0, 3), Settings: []byte("first"),
		Record:    []watcher.RecordEntry{{Kind: "settings", Who: "1000 ada", At: noon, Body: []byte("{}")}},
		NewRanges: []watcher.RangeKey{{ID: 1, Key: "own"}, {ID: 2, Key: "wide"}},
		Scales:    []watcher.GroupScale{{Range: 1, Group: "equity", Date: 5, Step: 1, Deviation: 0.01, Series: 7}, {Range: 1, Group: "eq", Date: 5, Step: 1, Deviation: 1}},
		States: []watcher.State{{Range: 1, Block: 0, Step: 1, Upto: 9, N: []uint32{3, 4}, Last: []rules.Date{9, rules.NoDate},
			Sum: []watcher.Int128{{Hi: 1<<64 - 1, Lo: 5}, {Lo: 1 << 63}}, Sq: []watcher.Int128{{Hi: 1 << 63}, {Lo: 3}}, Var: []float64{1, 2.5}}},
		Used: []watcher.UsedColumn{{Range: 1, Date: 5, Block: 0, Offsets: []uint16{0, 2}, Values: []int64{11, watcher.Missing64}}},
	}
	publish(t, l, b)
	if err := l.EndPass(watcher.PassRow{Number: 9, Started: noon, Ended: noon.Add(time.Second), Accepted: 1, Program: "v1"}); err != nil {
		t.Fatal(err)
	}
	v := read(t, l)
	check := func(what string, got, want any, err error) {
		t.Helper()
		if err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("%s: got %+v, %v; want %+v", what, got, err, want)
		}
	}
	f, err := v.File(1)
	check("file", f, b.File, err)
	f, _, err = v.FileSeen("admin", b.File.File.SHA256, "key")
	check("file seen", f, b.File, err)
	_, seen, err := v.FileSeen("admin", b.File.File.SHA256, "other")
	check("file not seen", seen, false, err)
	s, err := v.State(1, 0)
	check("state", s, &b.States[0], err)
	ranges, err := v.Ranges()
	check("ranges", ranges, b.NewRanges, err)
	scales, err := v.GroupScales(1, "equity")
	check("scales", scales, b.Scales[:1], err)
	text, err := v.Settings(1)
	check("settings", string(text), "first", err)
	pass, ok, err := v.LastPass()
	check("pass", pass, watcher.PassRow{Number: 1, Started: noon, Ended: noon.Add(time.Second), Accepted: 1, Program: "v1"}, err)
	check("pass there", ok, true, nil)
	used, err := v.Used(1, 2)
	check("used", used, []watcher.Version{{Date: 5, Step: 1, Value: watcher.Missing64}}, err)
	dst := []int64{1, 2, 3}
	err = v.Patch(1, 5, 0, 1, dst)
	check("patch", dst, []int64{1, watcher.Missing64, 3}, err)
	if _, err := v.File(2); !errors.Is(err, ErrNone) {
		t.Error(err)
	}
}

func TestNamesGrow(t *testing.T) {
	l := fresh(t)
	held := 0
	for step, n := range []int{3, 4076, 1, 1, 9000} {
		publish(t, l, &watcher.Batch{Step: uint32(step + 1), NewNames: names(held, n)})
		held += n
		got, err := read(t, l).Names()
		if err != nil || got.Len() != held {
			t.Fatal(got.Len(), err)
		}
		for i := range held {
			if string(got.Name(uint32(i))) != fmt.Sprintf("series-%d", i) {
				t.Fatalf("name %d is %q", i, got.Name(uint32(i)))
			}
		}
	}
}

func TestFlags(t *testing.T) {
	l := fresh(t)
	open := rules.Flag{Ref: 1, Step: 1, RaisedAt: noon, Date: 7, Series: "series-1", Group: "g", Kind: rules.KindBreach, Range: "own",
		Return: 123456789, Low: rules.Some(-1), High: rules.Some(1), Z: rules.Some(4), Tail: rules.Some(1e-9), Log10: rules.Some(-9),
		Standing: rules.Open, Feed: "admin", File: "nav-1.csv", Line: 17}
	late := rules.Flag{Ref: 2, Step: 1, RaisedAt: noon.Add(time.Hour), Date: 7, Kind: rules.KindLate, Return: rules.Missing,
		Standing: rules.OfHistory, Feed: "other", Note: "late"}
	restated := rules.Flag{Ref: 3, Step: 1, RaisedAt: noon, Date: 7, Series: "series-2", Kind: rules.KindRestated, Return: 0, Standing: rules.Open,
		Feed: "admin", File: "nav-1.csv"}
	publish(t, l, &watcher.Batch{Step: 1, File: fileRow(1), NewNames: names(0, 3), Flags: []*watcher.FlagRow{{Flag: restated, SeriesID: 2, New: true},
		{Flag: open, SeriesID: 1, New: true}, {Flag: late, SeriesID: watcher.NoSeries, New: true}}})
	expect := func(all bool, want ...rules.Flag) {
		t.Helper()
		var got []rules.Flag
		err := read(t, l).Flags(all, func(f rules.Flag) bool { got = append(got, f); return true })
		if err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("got %+v, %v; want %+v", got, err, want)
		}
	}
	expect(true, open, late, restated)
	expect(false, open, restated)
	if marked, err := read(t, l).Marked(7, 0); err != nil || !reflect.DeepEqual(marked, []int{1, 2}) {
		t.Error(marked, err)
	}
	decided := open
	decided.Standing, decided.Note = rules.Decided, "seen"
	decided.Last = &rules.Act{Deed: rules.SignOff, Step: 2, By: rules.Person{UID: 1002}, At: noon.Add(time.Minute), Value: rules.Missing, Until: rules.NoDate}
	decided.Decided = &rules.Act{Deed: rules.Decide, Step: 2, By: rules.Person{UID: 1001, Name: "second"}, At: noon, Conclusion: rules.Corrected, Value: -12,
		Reason: rules.Unexplained, Note: "said", Override: "why", Until: 9}
	publish(t, l, &watcher.Batch{Step: 2, File: fileRow(2), Flags: []*watcher.FlagRow{{Flag: decided}}})
	expect(true, decided, late, restated)
	expect(false, restated)
	got, ok, err := read(t, l).FlagAt(1, 7, rules.KindBreach)
	if err != nil || !ok || !reflect.DeepEqual(got, decided) {
		t.Error(got, ok, err)
	}
	if err := l.Publish(&watcher.Batch{Step: 3, Flags: []*watcher.FlagRow{{Flag: rules.Flag{Ref: 9, Kind: rules.KindLate, Standing: rules.Open}, New: true}}}); err == nil {
		t.Error("a flag whose ref is not the next one was taken")
	}
}

func TestOpenRefuses(t *testing.T) {
	dir := t.TempDir()
	write := func(name string, data []byte) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, data, 0o600); err != nil {
			t.Fatal(err)
		}
		return path
	}
	as := func(path string, want error) {
		t.Helper()
		if _, err := Open(path, Options{AnyFilesystem: true, Timeout: time.Millisecond}); !errors.Is(err, want) {
			t.Errorf("got %v, want %v", err, want)
		}
	}
	as(filepath.Join(dir, "none"), ErrMissing)
	as(write("empty", nil), ErrEmpty)
	var foreign *Foreign
	for _, path := range []string{write("text", []byte("date,series,return\n")), dir} {
		if _, err := Open(path, Options{AnyFilesystem: true}); !errors.As(err, &foreign) {
			t.Errorf("%s: %v", path, err)
		}
	}
	l := fresh(t)
	as(l.Path(), ErrHeld)
	if _, err := Open(l.Path(), Options{AnyFilesystem: true, Mode: Create}); !errors.Is(err, ErrExists) {
		t.Error(err)
	}
	info, err := os.Stat(l.Path())
	if err != nil || info.Mode().Perm() != 0o600 {
		t.Error(info.Mode(), err)
	}
}
