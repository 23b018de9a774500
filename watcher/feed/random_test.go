package feed

import (
	"fmt"
	"math/rand/v2"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// Files put together from pieces that are each almost right.
func TestReadRandom(t *testing.T) {
	heads := []string{"date,series,return", "series,return,date", "return,x,date,series", "date;series;return", "date,A,B", "A,date,B", "date;B;A", "date,series"}
	cells := []string{"2024-01-02", "2024-01-03", "2024-01-04", "2024-02-30", " 2024-01-02", "\"2024-01-03\"", "A", "B", "\"A\"", "\"C\"\"x\"", " B ", "0.01", "-0.02",
		"1e-2", "0.010", "", "NA", "0,5", "x", "123.456789012345678", "\"0.01\"", "\"a\nb\"", "99999", "\"", "\"\"", "0.12345678", "-1.5", "Ü", "\xfc"}
	ends := []string{"\n", "\n", "\n", "\r\n", "\n\n", "\r", ""}
	for seed := range uint64(1500) {
		rng := rand.New(rand.NewPCG(seed, 7))
		how := uint8(rng.IntN(256))
		sep := []string{",", ";"}[how>>1&1]
		var b strings.Builder
		b.WriteString(heads[rng.IntN(len(heads))])
		b.WriteString(ends[rng.IntN(4)])
		for range rng.IntN(8) {
			tidy := rng.IntN(4) > 0
			for i := range 3 {
				if i > 0 {
					b.WriteString(sep)
				}
				switch {
				case tidy && i == 0:
					b.WriteString(cells[rng.IntN(3)])
				case tidy && i == 1 && how&1 == 0:
					b.WriteString(cells[6+rng.IntN(4)])
				case tidy:
					b.WriteString(cells[11+rng.IntN(6)])
				default:
					b.WriteString(cells[rng.IntN(len(cells))])
				}
			}
			b.WriteString(ends[rng.IntN(len(ends))])
		}
		checkRead(t, []byte(b.String()), how)
		if t.Failed() {
			t.Fatalf("seed %d:\n%q", seed, b.String())
		}
	}
}

// invented is one row of a file, in text and as the columns must hold it.
type invented struct {
	date rules.Date
	id   int
	text string
	v    int64 // at rules.Places
	line uint32
}

// invent makes rows of several blocks of series with values of all kinds, in an order.
func invent(rng *rand.Rand, series, dates int, how order) []invented {
	first, _ := rules.DateOf(2023, 1, 2)
	var rows []invented
	add := func(d, s int) {
		dec := []int{0, 2, 4, 8, 15}[rng.IntN(5)]
		if d%3 == 0 {
			dec = 4
		}
		v := rng.Int64N(2_000_000) - 1_000_000
		if d%5 == 4 && s%7 == 0 {
			v *= 7919 * 1000
		}
		mul := int64(rules.Pow10(rules.Places - dec))
		if d%2 == 1 && rng.IntN(10) == 0 || v > 9_000_000_000_000_000_000/mul || v < -9_000_000_000_000_000_000/mul {
			return
		}
		rows = append(rows, invented{first + rules.Date(d), s, rules.Units(v * mul).String(), v * mul, 0})
	}
	for i := range series * dates {
		if how == bySeries {
			add(i%dates, i/dates)
		} else {
			add(i/series, i%series)
		}
	}
	if how == shuffled {
		rng.Shuffle(len(rows), func(i, j int) { rows[i], rows[j] = rows[j], rows[i] })
	}
	return rows
}

// Values, lines and numbers of series come out as they went in, whatever the order of rows and the cut of the work.
func TestColumnsHoldTheRows(t *testing.T) {
	for seed := range uint64(9) {
		rng := rand.New(rand.NewPCG(seed, 11))
		how := order(seed % 3)
		rows := invent(rng, 9000, 6, how)
		var b strings.Builder
		b.WriteString("date,series,return\n")
		line := uint32(1)
		for i := range rows {
			if rng.IntN(5000) == 0 {
				b.WriteByte('\n')
				line++
			}
			line++
			rows[i].line = line
			fmt.Fprintf(&b, "%s,S%d,%s\n", rows[i].date, rows[i].id, rows[i].text)
		}
		var sheets []*watcher.Sheet
		for _, o := range []Options{{Workers: 1}, {Workers: 2, chunk: 1000}, {Workers: 3, chunk: 77777}} {
			s, err := read(t, longFeed(), "a.csv", b.String(), o)
			if err != nil {
				t.Fatal(err)
			}
			sheets = append(sheets, s)
		}
		if !sameSheets(sheets[0], sheets[1]) || !sameSheets(sheets[0], sheets[2]) {
			t.Fatalf("seed %d: the sheet depends on the cut of the work", seed)
		}
		checkColumns(t, sheets[0])
		checkHolds(t, sheets[0], rows)
	}
}

func checkHolds(t *testing.T, s *watcher.Sheet, rows []invented) {
	t.Helper()
	if s.Rows != len(rows) {
		t.Fatalf("%d rows of %d", s.Rows, len(rows))
	}
	at := map[[2]int]*watcher.Column{}
	for _, c := range s.Columns {
		at[[2]int{int(c.Date), int(c.Block)}] = c
	}
	next := uint32(0)
	for _, r := range rows {
		id, ok := s.Names.Find(fmt.Appendf(nil, "S%d", r.id))
		if !ok || id > next {
			t.Fatalf("series S%d has number %d; %d have appeared", r.id, id, next)
		}
		next = max(next, id+1)
		c := at[[2]int{int(r.date), int(id / watcher.BlockSize)}]
		var v [1]int64
		c.Fill(v[:], int(id%watcher.BlockSize), rules.Places)
		if line := c.Line(int(id % watcher.BlockSize)); v[0] != r.v || line != r.line {
			t.Fatalf("S%d %s: %d on line %d, want %d on %d", r.id, r.date, v[0], line, r.v, r.line)
		}
	}
}

// A column is in its one canonical form: no zero at the end of all its values, 32 bits where they fit.
func TestColumnsAreCanonical(t *testing.T) {
	check := func(values string, decimals uint8, narrow bool) {
		t.Helper()
		text := "date,series,return\n"
		for i, v := range strings.Fields(values) {
			text += fmt.Sprintf("2024-01-02,S%d,%s\n", i, v)
		}
		s, err := read(t, longFeed(), "a.csv", text, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if c := s.Columns[0]; c.Decimals != decimals || (c.V32 != nil) != narrow {
			t.Errorf("%s: %d decimals, narrow %v; want %d, %v", values, c.Decimals, c.V32 != nil, decimals, narrow)
		}
	}
	check("0.01 0.02", 2, true)
	check("0.0100 0.02000000000000000000", 2, true)
	check("1 2 3", 0, true)
	check("0 0", 0, true)
	check("0.12345678 1", 8, true)
	check("1 0.12345678", 8, true)
	check("21.47483647 0.00000001", 8, true)
	check("21.47483648 0.00000001", 8, false)
	check("-21.47483647 0.00000001", 8, true)
	check("-21.47483648 0.00000001", 8, false)
	check("0.012345678901234 1", 15, false)
	check("1000 0.000000000000001", 15, false)
	check("0.000000000000001 0.000000000000002", 15, true)
	check("100 0.0000001 0.01", 7, true)
	check("1000 0.0000001 0.01", 7, false)
}

// Evenly spaced lines take no room.
func TestLinesAreShort(t *testing.T) {
	for how, want := range map[order]bool{byDate: true, bySeries: true, shuffled: false} {
		var b strings.Builder
		b.WriteString("date,series,return\n")
		for i := range 300 {
			d, s := i/100, i%100
			if how == bySeries {
				d, s = i%3, i/3
			} else if how == shuffled && d > 0 {
				s = s * 37 % 100
			}
			fmt.Fprintf(&b, "2024-01-0%d,S%d,0.01\n", d+2, s)
		}
		s, err := read(t, longFeed(), "a.csv", b.String(), Options{Workers: 2, chunk: 100})
		if err != nil {
			t.Fatal(err)
		}
		if short := s.Columns[2].Lines.At == nil; short != want {
			t.Errorf("order %d: lines short %v, want %v", how, short, want)
		}
	}
}
