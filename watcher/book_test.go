package watcher_test

import (
	"cmp"
	"context"
	"crypto/sha256"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/rules/causes"
	"strayd/watcher"
)

// entry is one row of a file.
type entry struct {
	date   rules.Date
	series string
	value  rules.Units
	days   int // business days that the value covers; 0 where the file does not say
}

// shelf is a source of files that lie in memory.
type shelf struct {
	files map[string][]entry
}

func (s *shelf) Find(f rules.Feed, _ time.Time, _ bool) (found watcher.Found, _ error) {
	for name, rows := range s.files {
		found.Ready = append(found.Ready, watcher.Candidate{Feed: f.Name, Name: name, Size: int64(len(rows)), Stamp: name})
	}
	slices.SortFunc(found.Ready, func(a, b watcher.Candidate) int { return strings.Compare(a.Name, b.Name) })
	return found, nil
}

// Read lays the rows out in columns by date and block.
func (s *shelf) Read(_ context.Context, c watcher.Candidate, _ rules.Feed, names *watcher.Names, _ time.Time, _ watcher.Progress) (*watcher.Sheet, error) {
	sheet := &watcher.Sheet{File: watcher.File{Name: c.Name, Size: c.Size}, Names: names, Held: names.Len(), Rows: len(s.files[c.Name])}
	sheet.File.SHA256 = sha256.Sum256(fmt.Append(nil, s.files[c.Name]))
	type placed struct {
		date  rules.Date
		id    uint32
		value rules.Units
		line  uint32
	}
	sheet.Days = s.termed()
	var cells []placed
	for n, e := range s.files[c.Name] {
		if e.days > 1 {
			sheet.Terms = append(sheet.Terms, watcher.CellTerms{Date: e.date, Series: names.Add([]byte(e.series)), Terms: rules.Terms{Days: e.days}})
		}
		cells = append(cells, placed{e.date, names.Add([]byte(e.series)), e.value, uint32(n + 2)})
	}
	sheet.Terms = watcher.SortTerms(sheet.Terms)
	slices.SortFunc(cells, func(a, b placed) int { return cmp.Or(cmp.Compare(a.date, b.date), cmp.Compare(a.id, b.id)) })
	var build *watcher.Cells
	for n, p := range cells {
		if n == 0 || cells[n-1].date != p.date || cells[n-1].id/watcher.BlockSize != p.id/watcher.BlockSize {
			build = watcher.NewCells(p.date, p.id/watcher.BlockSize, rules.Places)
			sheet.Columns = append(sheet.Columns, nil)
		}
		build.Set(int(p.id%watcher.BlockSize), int64(p.value), p.line)
		if n == len(cells)-1 || cells[n+1].date != p.date || cells[n+1].id/watcher.BlockSize != p.id/watcher.BlockSize {
			sheet.Columns[len(sheet.Columns)-1] = build.Column()
		}
	}
	return sheet, nil
}

// termed says that the files tell of the days that values cover.
func (s *shelf) termed() bool {
	for _, rows := range s.files {
		if slices.ContainsFunc(rows, func(e entry) bool { return e.days > 0 }) {
			return true
		}
	}
	return false
}

// silent is a pool that has nothing to say.
type silent struct{}

func (silent) Step(causes.Day) *causes.Result { return &causes.Result{} }

// run takes every file of the shelf in one pass, judged by its ranges alone.
func run(t *testing.T, m *memory, s *shelf, settings rules.Settings, workers int) {
	t.Helper()
	runWith(t, m, s, settings, workers, nil)
}

// runWith is run with what the passes before it left in memory.
func runWith(t *testing.T, m *memory, s *shelf, settings rules.Settings, workers int, kept *watcher.Resident) {
	t.Helper()
	p := &watcher.Pass{Resident: kept, Store: m, Source: s, Settings: settings, Feeds: []rules.Feed{{Name: "book"}}, FeedKey: func(rules.Feed) string { return "key" },
		Now: time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC), Settled: true, Workers: workers}
	if s.termed() {
		p.Feeds[0].Columns.Days = "days"
	}
	p.SetWeigher(func([]causes.Member, []string) watcher.Weigher { return silent{} })
	if _, err := p.Run(context.Background()); err != nil {
		t.Fatal(err)
	}
}

// randomFiles is a book of series with holes, late starts, gaps, outliers, constants, late and restated values, in one file a date.
func randomFiles(r *rand.Rand, series, dates int, rough bool) map[string][]entry {
	files := map[string][]entry{}
	first, _ := rules.DateOf(2025, 1, 6)
	place := make([]float64, series)
	for s := range place {
		place[s] = []float64{1e-5, 0.002, 0.01}[r.IntN(3)]
	}
	for n := range dates {
		d := first + rules.Date(n/5*7+n%5)
		for s := range series {
			name := fmt.Sprintf("group%d-%05d", s%3, s)
			switch {
			case r.IntN(25) == 0, s%7 == 3 && n < dates/2, s%5 == 2 && n > dates/4 && n <= dates/4+18+s/5%4: // gaps of 19 to 22 business days
				continue
			}
			e := entry{date: d, series: name, value: draw(r, place[s])}
			at := n
			if rough && r.IntN(40) == 0 {
				at += 1 + r.IntN(8)
			}
			if rough && r.IntN(40) == 0 {
				wrong := e
				wrong.value = draw(r, 0.05)
				add(files, at, wrong)
				at += 1 + r.IntN(8)
			}
			add(files, at, e)
		}
	}
	return files
}

func add(files map[string][]entry, at int, e ...entry) {
	name := fmt.Sprintf("f%04d", at)
	files[name] = append(files[name], e...)
}

func draw(r *rand.Rand, deviation float64) rules.Units {
	x := r.NormFloat64() * deviation
	switch r.IntN(30) {
	case 0:
		x *= 6
	case 1:
		x = 0
	case 2:
		x *= 100
	}
	if r.IntN(500) == 0 {
		x = 150
	}
	return rules.Units(math.Round(x*1e8)) * 1e7
}
