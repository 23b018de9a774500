package feed

import (
	"errors"
	"fmt"
	"math/big"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
	"unicode"

	"strayd/rules"
	"strayd/watcher"
)

// FuzzNumber compares the thorough and the fast way of reading a value with exact rationals.
func FuzzNumber(f *testing.F) {
	for _, s := range []string{"0", "-0.01", "1e-3", "9223.372036854775807", "123.4567890123456786", "0.0000000000000005", "1e-0020", "00012.3400",
		"999999999999999999", "9999999999999999999.9e-16", ".5", "5.", "1e", "+1", "-", "1,5", "12345678.12345678", "0.5e-15", "1.5e-15", "2.5e-15"} {
		for shift := range uint8(6) {
			f.Add(s, shift)
		}
	}
	f.Fuzz(checkNumber)
}

func checkNumber(t *testing.T, s string, how uint8) {
	a := amount{mark: '.', shift: []int{0, 2, 4}[how%3], places: rules.Places}
	if how&8 != 0 {
		a.mark = ','
	}
	if how&16 != 0 {
		a.places, a.shift = rules.PricePlaces, 0
	}
	if strings.ContainsAny(s, ";\n\r\"") || len(s) > 1000 {
		return
	}
	want, ok := slowUnits(s, a.mark, a.shift, a.places)
	v, dec, why := a.exact([]byte(s))
	if ok != (why == numberGood) || ok && !equalUnits(v, dec, a.places, want) {
		t.Errorf("%q %+v: %d e-%d (%d), want %v %v", s, a, v, dec, why, want, ok)
	}
	// The fast way, in a line, as the parser goes it.
	p := &parser{plan: &plan{amount: a, comma: ';', limits: Options{}.filled(false).Limits}}
	p.setMost()
	p.cursor = cursor{text: []byte(s + ";\n"), sep: ';'}
	good := p.takeValue()
	if trimmed := strings.Trim(s, " \t"); trimmed != s {
		want, ok = slowUnits(trimmed, a.mark, a.shift, a.places)
	}
	if good != ok || ok && (!equalUnits(p.v, p.dec, a.places, want) || p.at != len(s)) {
		t.Errorf("%q in a line %+v: %d e-%d, want %v %v", s, a, p.v, p.dec, want, ok)
	}
}

func equalUnits(v int64, dec uint8, places int, want *big.Int) bool {
	got := new(big.Int).Mul(big.NewInt(v), power(places-int(dec)).Num())
	return got.Cmp(want) == 0
}

// Random numbers of every length around the places where ways part.
func TestNumberRandom(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	for range 200_000 {
		var b strings.Builder
		b.WriteString([]string{"", "-", "+"}[rng.IntN(3)])
		digits := func(n int) {
			for range n {
				b.WriteByte(byte('0' + []int{0, 5, 9, rng.IntN(10)}[rng.IntN(4)]))
			}
		}
		digits(rng.IntN(22))
		if rng.IntN(3) > 0 {
			b.WriteByte('.')
			digits(rng.IntN(22))
		}
		if rng.IntN(3) == 0 {
			fmt.Fprintf(&b, "e%d", rng.IntN(44)-22)
		}
		checkNumber(t, b.String(), uint8(rng.IntN(32)))
	}
}

// FuzzRead reads anything as each layout: no panic; a refusal has a reason; the result does not depend on workers and chunks; and
// what the slow reader takes, it takes in the same way.
func FuzzRead(f *testing.F) {
	entries, err := os.ReadDir(filepath.Join("testdata", "broken"))
	if err != nil {
		f.Fatal(err)
	}
	for i, e := range entries {
		text, err := os.ReadFile(filepath.Join("testdata", "broken", e.Name()))
		if err != nil {
			f.Fatal(err)
		}
		f.Add(text, uint8(i))
	}
	f.Add([]byte("date,series,return\n2024-01-02,A,0.01\n2024-01-03,A,NA\n\n2024-01-02,\"B\",1e-2\n2024-01-02,A,0.010"), uint8(0))
	f.Add([]byte("date,A,B\n2024-01-02,0.01,\n\n2024-01-03,1,\"-0.02\"\n"), uint8(1))
	f.Add([]byte("date;series;return\r\n2024-01-02;A;0,01\r\n"), uint8(2))
	f.Fuzz(checkRead)
}

func checkRead(t *testing.T, text []byte, how uint8) {
	f := longFeed()
	if how&1 != 0 {
		f.Layout = rules.Wide
	}
	if how&2 != 0 {
		f.Separator, f.Decimal = ';', ','
	}
	if how&4 != 0 {
		f.SkipShare = 0.5
	}
	f.Unit = []rules.Unit{rules.Fraction, rules.Percent, rules.BP}[how>>3%3]
	one, err := read(t, f, "a.csv", string(text), Options{Workers: 1})
	three, err3 := read(t, f, "a.csv", string(text), Options{Workers: 3, chunk: 1 + int(how)%50})
	if fmt.Sprint(err) != fmt.Sprint(err3) {
		t.Fatalf("one worker: %v\nthree workers: %v", err, err3)
	}
	var bad *watcher.BadFile
	switch {
	case err == nil && !sameSheets(one, three):
		t.Fatalf("one worker:\n%sthree workers:\n%s", spell(one), spell(three))
	case err == nil:
		checkColumns(t, one)
	case !errors.As(err, &bad) || bad.Reason == "" || bad.Column > 0 && bad.Line == 0 || bad.File.SHA256 != sum(text):
		t.Fatalf("a refusal without reason, place or hash: %v", err)
	}
	if f.Layout == rules.Long && f.SkipShare == 0 && !odd(text) {
		checkSlow(t, text, f, one, err)
	}
}

// odd text is where encoding/csv goes its own way: no judge of ours.
func odd(text []byte) bool {
	return strings.ContainsAny(string(text), "\r\x00\ufeff") || !strings.Contains(string(text), "\n") ||
		strings.ContainsFunc(string(text), func(r rune) bool { return r != '\n' && r != '\t' && !unicode.IsPrint(r) })
}

func checkSlow(t *testing.T, text []byte, f rules.Feed, s *watcher.Sheet, err error) {
	slow, ok := slowRead(string(text), f)
	if err == nil && ok && spell(s) != spellSlow(slow, s.Names) {
		t.Fatalf("got\n%sthe slow reader has\n%s", spell(s), spellSlow(slow, s.Names))
	}
	if err == nil && !ok && !blanks(text) {
		t.Fatalf("taken, but the slow reader refuses it:\n%s", spell(s))
	}
	if err != nil && ok && !oursAlone(err) {
		t.Fatalf("refused, but the slow reader takes it: %v", err)
	}
}

// blanks says whether a line or a header's name is made of spaces, of which encoding/csv makes cells.
func blanks(text []byte) bool {
	return strings.Contains(string(text), " ") || strings.Contains(string(text), "\t")
}

// oursAlone are the refusals that the slow reader does not know.
func oursAlone(err error) bool {
	for _, s := range []string{"twice", "sep=", "longer than", "separator", "ASCII", "more than", "invisible", "UTF"} {
		if strings.Contains(err.Error(), s) {
			return true
		}
	}
	return false
}

func sameSheets(a, b *watcher.Sheet) bool {
	if a.Rows != b.Rows || a.Repeated != b.Repeated || a.Skipped != b.Skipped || a.Missing != b.Missing || a.File != b.File ||
		!reflect.DeepEqual(a.Notes, b.Notes) || a.Names.Len() != b.Names.Len() || !reflect.DeepEqual(a.Columns, b.Columns) {
		return false
	}
	for id := range uint32(a.Names.Len()) {
		if string(a.Names.Name(id)) != string(b.Names.Name(id)) {
			return false
		}
	}
	return true
}

// checkColumns holds what watcher.Column promises.
func checkColumns(t *testing.T, s *watcher.Sheet) {
	t.Helper()
	rows := 0
	for i, c := range s.Columns {
		if i > 0 && (c.Date < s.Columns[i-1].Date || c.Date == s.Columns[i-1].Date && c.Block <= s.Columns[i-1].Block) {
			t.Fatal("columns are out of order")
		}
		if (c.V32 == nil) == (c.V64 == nil) || c.Len() == 0 || c.Len() > watcher.BlockSize || int(c.Decimals) > s.What.Places() {
			t.Fatalf("column %s %d is malformed", c.Date, c.Block)
		}
		vals := make([]int64, c.Len())
		c.Fill(vals, 0, s.What.Places())
		for j, v := range vals {
			if (v == watcher.Missing64) != (c.Line(j) == 0) {
				t.Fatalf("column %s %d offset %d: value %d, line %d", c.Date, c.Block, j, v, c.Line(j))
			}
			if v != watcher.Missing64 {
				rows++
			}
		}
		if vals[len(vals)-1] == watcher.Missing64 {
			t.Fatalf("column %s %d ends without a value", c.Date, c.Block)
		}
	}
	if rows != s.Rows {
		t.Fatalf("%d values in the columns, %d rows", rows, s.Rows)
	}
}
