package main

import (
	"bufio"
	"compress/gzip"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"time"
)

// seed makes every book the same on every machine.
const seed = 20260101

// order is the order of a book's rows.
type order int

const (
	byDate   order = iota // date by date, series in the order of their names
	bySeries              // series by series, each by date
	shuffled              // date by date, series shuffled anew on each
)

// layout is how a book is written.
type layout int

const (
	long layout = iota
	wide
	prices
)

// book is a table of invented returns: series x dates business days, beginning from days after the first of all.
type book struct {
	series, from, dates int
	order               order
	layout              layout
	gzip                bool
}

func (b book) rows() int { return b.series * b.dates }

// draws are returns with heavy tails: Student t with 5 degrees of freedom, scaled to unit variance, in units of 1e-8 for a
// deviation of 1 %.
var draws = func() (t [1 << 16]int32) {
	r := rand.New(rand.NewPCG(seed, 5))
	for i := range t {
		chi := 0.0
		for range 5 {
			x := r.NormFloat64()
			chi += float64(x * x)
		}
		t[i] = int32(1e6 * r.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5))
	}
	return t
}()

// digits are all numbers of four digits, one after another.
var digits = func() (t [40000]byte) {
	for i := range 10000 {
		for k, n := 3, i; k >= 0; k, n = k-1, n/10 {
			t[4*i+k] = byte('0' + n%10)
		}
	}
	return t
}()

// mix is the finaliser of splitmix64 (Steele, Lea and Flood 2014).
func mix(x uint64) uint64 {
	x = (x ^ x>>30) * 0xbf58476d1ce4e5b9
	x = (x ^ x>>27) * 0x94d049bb133111eb
	return x ^ x>>31
}

// value is the return of a series on a date, in units of 1e-8. Deviations run from 0.5 % to 2 %.
func value(series, date int) int64 {
	h := mix(seed + uint64(series)<<32 + uint64(date))
	scale := 512 + int64(mix(uint64(series))%1536)
	return int64(draws[h&0xffff]) * scale >> 10
}

// writer writes rows.
type writer struct {
	*bufio.Writer
	dates []string
	price []float64 // by series
	line  []byte
}

// day is the n-th business day of all books.
func day(n int) time.Time {
	first := time.Date(2001, 1, 1, 0, 0, 0, 0, time.UTC) // a Monday
	return first.AddDate(0, 0, n/5*7+n%5)
}

func name(dst []byte, series int) []byte {
	dst = append(dst, "fund"...)
	dst = append(dst, digits[4*(series/10000)+2:4*(series/10000)+4]...)
	return append(dst, digits[4*(series%10000):][:4]...)
}

// decimal writes v x 1e-8.
func decimal(dst []byte, v int64) []byte {
	if v < 0 {
		dst, v = append(dst, '-'), -v
	}
	dst = strconv.AppendInt(dst, v/1e8, 10)
	dst = append(dst, '.')
	v %= 1e8
	dst = append(dst, digits[4*(v/10000):][:4]...)
	return append(dst, digits[4*(v%10000):][:4]...)
}

// write makes a file of the book.
func (b book) write(path string) error {
	f, err := os.Create(path)
	if err != nil {
		return err
	}
	defer f.Close()
	var out io.Writer = f
	var z *gzip.Writer
	if b.gzip {
		if z, err = gzip.NewWriterLevel(f, gzip.BestSpeed); err != nil {
			return err
		}
		out = z
	}
	w := &writer{Writer: bufio.NewWriterSize(out, 1<<18)}
	for n := range b.dates {
		w.dates = append(w.dates, day(b.from+n).Format(time.DateOnly))
	}
	b.all(w)
	if err := w.Flush(); err != nil {
		return err
	}
	if z != nil {
		if err := z.Close(); err != nil {
			return err
		}
	}
	return f.Sync() // writing it back must not fall into a measurement
}

// all writes the header and every row; errors stay in the buffered writer.
func (b book) all(w *writer) {
	switch b.layout {
	case wide:
		b.wide(w)
		return
	case prices:
		for range b.series {
			w.price = append(w.price, 100)
		}
		w.WriteString("date,series,price\n")
	default:
		w.WriteString("date,series,return\n")
	}
	perm := make([]int, b.series)
	for i := range perm {
		perm[i] = i
	}
	r := rand.New(rand.NewPCG(seed, uint64(b.from)))
	if b.order == bySeries {
		for s := range b.series {
			for d := range b.dates {
				b.row(w, s, d)
			}
		}
		return
	}
	for d := range b.dates {
		if b.order == shuffled {
			r.Shuffle(len(perm), func(i, k int) { perm[i], perm[k] = perm[k], perm[i] })
		}
		for _, s := range perm {
			b.row(w, s, d)
		}
	}
}

func (b book) row(w *writer, s, d int) {
	v := value(s, b.from+d)
	if b.layout == prices {
		w.price[s] *= 1 + float64(v)*1e-8
		v = int64(math.Round(w.price[s]*1e4)) * 1e4
	}
	w.line = append(w.line[:0], w.dates[d]...)
	w.line = append(w.line, ',')
	w.line = name(w.line, s)
	w.line = append(w.line, ',')
	w.line = decimal(w.line, v)
	w.Write(append(w.line, '\n'))
}

func (b book) wide(w *writer) {
	w.WriteString("date")
	for s := range b.series {
		w.Write(name(append(w.line[:0], ','), s))
	}
	for d := range b.dates {
		w.WriteByte('\n')
		w.WriteString(w.dates[d])
		for s := range b.series {
			w.Write(decimal(append(w.line[:0], ','), value(s, b.from+d)))
		}
	}
	w.WriteByte('\n')
}
