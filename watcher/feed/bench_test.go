package feed

import (
	"bufio"
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"runtime"
	"runtime/debug"
	"strconv"
	"strings"
	"syscall"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// order says how the rows of an invented long file follow one another.
type order int

const (
	byDate order = iota
	bySeries
	shuffled // within each date
)

// layLong writes invented returns of 8 decimals and gives the candidate.
func layLong(b testing.TB, series, dates int, how order) watcher.Candidate {
	b.Helper()
	dir := os.Getenv("STRAYD_BENCH_DIR")
	if dir == "" {
		dir = b.TempDir()
	}
	name := fmt.Sprintf("long-%d-%d-%d.csv", series, dates, how)
	path := filepath.Join(dir, name)
	if _, err := os.Stat(path); err != nil {
		writeLong(b, path, series, dates, how)
	}
	return candidate(b, dir, name)
}

func writeLong(b testing.TB, path string, series, dates int, how order) {
	file, err := os.Create(path)
	if err != nil {
		b.Fatal(err)
	}
	defer file.Close()
	w := bufio.NewWriterSize(file, 1<<20)
	defer w.Flush()
	w.WriteString("date,series,return\n")
	rng := rand.New(rand.NewPCG(1, 2))
	day := weekdays(dates)
	perm := rng.Perm(series)
	row := func(d, s int) {
		w.WriteString(day[d])
		fmt.Fprintf(w, ",S%06d,", s)
		w.WriteString(strconv.FormatFloat(rng.NormFloat64()/100, 'f', 8, 64))
		w.WriteByte('\n')
	}
	for i := range series * dates {
		switch how {
		case byDate:
			row(i/series, i%series)
		case bySeries:
			row(i%dates, i/dates)
		case shuffled:
			if i >= series && i%series == 0 {
				rng.Shuffle(series, func(i, j int) { perm[i], perm[j] = perm[j], perm[i] })
			}
			row(i/series, perm[i%series])
		}
	}
}

// weekdays lists the last n weekdays up to the clock of the tests.
func weekdays(n int) []string {
	days := make([]string, n)
	for d := rules.DateFrom(testNow); n > 0; d-- {
		if w := d.Weekday(); w != 0 && w != 6 {
			n--
			days[n] = d.String()
		}
	}
	return days
}

// layWide writes invented returns with one column a series.
func layWide(b testing.TB, series, dates int) watcher.Candidate {
	b.Helper()
	var text strings.Builder
	rng := rand.New(rand.NewPCG(3, 4))
	text.WriteString("date")
	for s := range series {
		fmt.Fprintf(&text, ",S%06d", s)
	}
	for _, day := range weekdays(dates) {
		text.WriteString("\n" + day)
		for range series {
			text.WriteByte(',')
			text.WriteString(strconv.FormatFloat(rng.NormFloat64()/100, 'f', 8, 64))
		}
	}
	text.WriteByte('\n')
	return lay(b, "wide.csv", []byte(text.String()))
}

// bench reads a file over and over and prints rows a second, processor time a row and the greatest memory of the process. With
// names nil every reading begins with none.
func bench(b *testing.B, f rules.Feed, c watcher.Candidate, names *watcher.Names) {
	b.SetBytes(c.Size)
	rows, cpu := 0, 0.0
	for b.Loop() {
		held := names
		if held == nil {
			held = watcher.NewNames(nil, nil)
		}
		before := used(b)
		s, err := Read(context.Background(), c, f, held, Options{Now: testNow})
		if err != nil {
			b.Fatal(err)
		}
		rows += s.Rows
		cpu += seconds(used(b)) - seconds(before)
		b.StopTimer()
		s = nil
		runtime.GC()
		debug.FreeOSMemory()
		b.StartTimer()
	}
	b.ReportMetric(float64(rows)/b.Elapsed().Seconds()/1e6, "Mrows/s")
	b.ReportMetric(cpu*1e9/float64(rows), "cpu-ns/row")
	b.ReportMetric(float64(used(b).Maxrss)/1024, "peak-MiB")
}

func used(b *testing.B) syscall.Rusage {
	var use syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &use); err != nil {
		b.Fatal(err)
	}
	return use
}

func seconds(u syscall.Rusage) float64 {
	return float64(u.Utime.Sec+u.Stime.Sec) + float64(u.Utime.Usec+u.Stime.Usec)/1e6
}

// manyNames are the series of the files of a day, in order.
func manyNames(n int) *watcher.Names {
	names := watcher.NewNames(nil, nil)
	for s := range n {
		names.Add(fmt.Appendf(nil, "S%06d", s))
	}
	return names
}

// benchSeries is how many series the long files have: 2,000, or STRAYD_BENCH_SERIES.
func benchSeries() int {
	if n, err := strconv.Atoi(os.Getenv("STRAYD_BENCH_SERIES")); err == nil {
		return n
	}
	return 2000
}

// The files lie in the folder of STRAYD_BENCH_DIR and stay there, or else in a folder that is taken away again.
func BenchmarkLongByDate(b *testing.B) {
	bench(b, longFeed(), layLong(b, benchSeries(), 5000, byDate), nil)
}

func BenchmarkLongBySeries(b *testing.B) {
	bench(b, longFeed(), layLong(b, benchSeries(), 5000, bySeries), nil)
}

func BenchmarkLongShuffled(b *testing.B) {
	bench(b, longFeed(), layLong(b, benchSeries(), 5000, shuffled), nil)
}

func BenchmarkLongDay(b *testing.B) {
	bench(b, longFeed(), layLong(b, 1_000_000, 1, byDate), manyNames(1_000_000))
}

func BenchmarkLongDayShuffled(b *testing.B) {
	c := layLong(b, 1_000_000, 2, shuffled)
	bench(b, longFeed(), c, manyNames(1_000_000))
}

func BenchmarkLongDayNew(b *testing.B) { bench(b, longFeed(), layLong(b, 1_000_000, 1, byDate), nil) }

func BenchmarkWideDay(b *testing.B) {
	bench(b, wideFeed(), layWide(b, 1_000_000, 1), manyNames(1_000_000))
}

func BenchmarkWideYears(b *testing.B) { bench(b, wideFeed(), layWide(b, 2000, 1000), nil) }
