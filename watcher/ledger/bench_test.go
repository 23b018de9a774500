package ledger

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// history makes the columns of a first load: series for so many dates, 8-decimal returns of about 1 %.
func history(series, dates int) []*watcher.Column {
	rng := rand.New(rand.NewPCG(1, 2))
	var columns []*watcher.Column
	line := uint32(2)
	for d := range dates {
		for from := 0; from < series; from += watcher.BlockSize {
			n := min(watcher.BlockSize, series-from)
			c := &watcher.Column{Date: rules.Date(d), Block: uint32(from / watcher.BlockSize), Decimals: 8, V32: make([]int32, n),
				Lines: watcher.Lines{First: line, Stride: 1}}
			for i := range c.V32 {
				c.V32[i] = rng.Int32N(2e6) - 1e6
			}
			line += uint32(n)
			columns = append(columns, c)
		}
	}
	return columns
}

func benchLedger(b *testing.B) *Ledger {
	b.Helper()
	l, err := Open(filepath.Join(b.TempDir(), "ledger.db"), Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		b.Fatal(err)
	}
	return l
}

func fileSize(b *testing.B, l *Ledger) float64 {
	info, err := os.Stat(l.Path())
	if err != nil {
		b.Fatal(err)
	}
	return float64(info.Size())
}

// BenchmarkFirstLoad publishes a history; STRAYD_BENCH_DATES changes its length from 5,000 dates. Peak is of the Go heap beyond
// the batch itself.
func BenchmarkFirstLoad(b *testing.B) {
	dates := 5000
	if n, err := strconv.Atoi(os.Getenv("STRAYD_BENCH_DATES")); err == nil {
		dates = n
	}
	for _, series := range []int{2000, 10000} {
		if series*dates > 10e6 && os.Getenv("STRAYD_BENCH_LARGE") == "" {
			continue
		}
		b.Run(fmt.Sprintf("%dx%d", series, dates), func(b *testing.B) {
			batch := &watcher.Batch{Step: 1, File: fileRow(1), NewNames: names(0, series), Returns: history(series, dates)}
			rows := float64(series) * float64(dates)
			for b.Loop() {
				b.StopTimer()
				l := benchLedger(b)
				runtime.GC()
				var before, after runtime.MemStats
				runtime.ReadMemStats(&before)
				b.StartTimer()
				if err := l.Publish(batch); err != nil {
					b.Fatal(err)
				}
				b.StopTimer()
				runtime.ReadMemStats(&after)
				b.ReportMetric(fileSize(b, l)/rows, "B/obs")
				b.ReportMetric(float64(after.HeapSys-before.HeapInuse)/1e6, "heapMB")
				l.Close()
				os.Remove(l.Path())
				b.StartTimer()
			}
			b.ReportMetric(rows*float64(b.N)/b.Elapsed().Seconds()/1e6, "Mobs/s")
		})
	}
}

// written is how many bytes this process has handed to write calls, from /proc/self/io.
func written() (n float64) {
	data, _ := os.ReadFile("/proc/self/io")
	var rchar, wchar float64
	fmt.Sscanf(string(data), "rchar: %f\nwchar: %f", &rchar, &wchar)
	return wchar
}

// BenchmarkDay publishes one date of a million series after 60 dates of them.
func BenchmarkDay(b *testing.B) {
	const series = 1_000_000
	l := benchLedger(b)
	defer l.Close()
	step := uint32(0)
	next := func(date int, n [][]byte) *watcher.Batch {
		step++
		columns := history(series, 1)
		for _, c := range columns {
			c.Date = rules.Date(date)
		}
		return &watcher.Batch{Step: step, File: fileRow(step), NewNames: n, Returns: columns}
	}
	publish(b, l, next(0, names(0, series)))
	for d := range 20 {
		publish(b, l, next(1+d, nil))
	}
	date := 100
	before := 0.0
	for b.Loop() {
		b.StopTimer()
		batch := next(date, nil)
		date++
		runtime.GC()
		w := written()
		b.StartTimer()
		publish(b, l, batch)
		b.StopTimer()
		before += written() - w
		b.StartTimer()
	}
	b.ReportMetric(before/float64(b.N)/1e6, "MB-written")
}

// BenchmarkFill reads full columns one after another.
func BenchmarkFill(b *testing.B) {
	l := benchLedger(b)
	defer l.Close()
	publish(b, l, &watcher.Batch{Step: 1, NewNames: names(0, watcher.BlockSize), Returns: history(watcher.BlockSize, 100)})
	v, err := l.Read()
	if err != nil {
		b.Fatal(err)
	}
	defer v.Close()
	dst := make([]int64, watcher.BlockSize)
	i := 0
	for b.Loop() {
		if ok, err := v.Fill(watcher.Returns, rules.Date(i%100), 0, 0, dst); !ok || err != nil {
			b.Fatal(err)
		}
		i++
	}
}

// BenchmarkSeries reads 5,000 dates of one of 10,000 series.
func BenchmarkSeries(b *testing.B) {
	l := benchLedger(b)
	defer l.Close()
	publish(b, l, &watcher.Batch{Step: 1, NewNames: names(0, 10000), Returns: history(10000, 5000)})
	v, err := l.Read()
	if err != nil {
		b.Fatal(err)
	}
	defer v.Close()
	for b.Loop() {
		if list, err := v.Series(watcher.Returns, 6000); len(list) != 5000 || err != nil {
			b.Fatal(len(list), err)
		}
	}
}

// BenchmarkNames loads a million names.
func BenchmarkNames(b *testing.B) {
	l := benchLedger(b)
	defer l.Close()
	publish(b, l, &watcher.Batch{Step: 1, NewNames: names(0, 1_000_000)})
	v, err := l.Read()
	if err != nil {
		b.Fatal(err)
	}
	defer v.Close()
	for b.Loop() {
		if n, err := v.Names(); err != nil || n.Len() != 1_000_000 {
			b.Fatal(err)
		}
	}
}

// BenchmarkFlags publishes a hundred thousand flags of a first load and reads them all.
func BenchmarkFlags(b *testing.B) {
	rows := make([]*watcher.FlagRow, 100_000)
	for i := range rows {
		rows[i] = &watcher.FlagRow{SeriesID: uint32(i % 2000), New: true, Flag: rules.Flag{Ref: uint64(i + 1), Step: 1, RaisedAt: noon,
			Date: rules.Date(i / 20), Group: "equity", Kind: rules.KindBreach, Range: "own", Return: rules.Units(i) * 1e9, Low: rules.Some(-0.1),
			High: rules.Some(0.1), Z: rules.Some(4), Tail: rules.Some(1e-4), Log10: rules.Some(-4), Standing: rules.OfHistory, Feed: "admin",
			File: "nav-1.csv", Line: uint32(i)}}
	}
	f := fileRow(1)
	f.Received = noon
	for b.Loop() {
		b.StopTimer()
		l := benchLedger(b)
		b.StartTimer()
		start := time.Now()
		publish(b, l, &watcher.Batch{Step: 1, File: f, NewNames: names(0, 2000), Flags: rows})
		b.ReportMetric(float64(time.Since(start).Milliseconds()), "publish-ms")
		b.ReportMetric(fileSize(b, l)/float64(len(rows)), "B/flag")
		n := 0
		if err := read(b, l).Flags(true, func(rules.Flag) bool { n++; return true }); err != nil || n != len(rows) {
			b.Fatal(n, err)
		}
		b.StopTimer()
		b.StartTimer()
	}
}
