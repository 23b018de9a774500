package main

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// delivery is files that a pass finds together, and what must be held once it has taken them. The passes of all rounds read the
// same inbox, which they only read.
type delivery struct {
	dir     string // holds the inboxes, and the ledger as it was before
	files   []deliveredFile
	dates   []time.Time
	flags   string        // what `flags --all` lists in the end, from a pass that nobody disturbed
	lasting time.Duration // of that pass
}

// deliveredFile is one file in the order in which a pass takes it.
type deliveredFile struct {
	name string
	rows []observed // nil of a file that is refused
	wide bool       // it is the large one: bigSeries by bigDates
}

// observed is one row of a file. The value is in units of 1e-15.
type observed struct {
	series string
	date   rules.Date
	value  int64
}

// The large file: its values need eight bytes each, so that its columns and flags are staged in more than one commit (of 6 MB) before
// the one that publishes it.
const (
	bigSeries = 500
	bigDates  = 1800
)

// bigValue is a return of the large file, in units of 1e-13: a different one for every cell, and now and then one out of line.
func bigValue(series, date int) int64 {
	h := uint64(series*bigDates+date+1) * 0x9E3779B97F4A7C15 // 2^64/phi: neighbours land far apart
	v := int64(h>>24)%200_000_000_000 - 100_000_000_000
	if h%211 == 0 {
		v *= 9
	}
	return v
}

func bigName(series int) string { return fmt.Sprintf("big-%03d", series) }

// crashConfig reads two inboxes wherever the ledger lies.
func (d *delivery) config() string {
	return fmt.Sprintf(`ledger: ledger.db
feeds:
  - {name: book, files: %q, unit: fraction}
  - {name: large, files: %q, unit: fraction, layout: wide, columns: {date: date}}
ranges:
  - name: own
  - {name: quick, scale: weighted, window: 20}
  - {name: hard, limit: [-50%%, 50%%]}
`, filepath.Join(d.dir, "book", "*.csv"), filepath.Join(d.dir, "large", "*.csv"))
}

// deliver invents a delivery: some days of a small book, restatements of earlier days in it, a file with a bad cell, and, where
// asked for, the large file.
func deliver(t *testing.T, r *rand.Rand, large bool) *delivery {
	d := &delivery{dir: t.TempDir()}
	for n := 0; len(d.dates) < bigDates+40; n++ {
		if day := time.Date(2019, 1, 1+n, 0, 0, 0, 0, time.UTC); day.Weekday()%6 != 0 {
			d.dates = append(d.dates, day)
		}
	}
	for _, name := range []string{"book", "large"} {
		if err := os.Mkdir(filepath.Join(d.dir, name), 0o755); err != nil {
			t.Fatal(err)
		}
	}
	d.history(t, r)
	for n := range 3 + r.IntN(3) {
		d.day(t, r, 30+n, n > 0)
	}
	d.put(t, "book/"+d.dates[39].Format(time.DateOnly)+".csv", "date,series,return\n2019-02-25,fund-00,0.01\n2019-02-25,fund-01,1,5\n")
	d.files = append(d.files, deliveredFile{name: d.dates[39].Format(time.DateOnly) + ".csv"})
	if large {
		d.large(t)
	}
	d.undisturbed(t)
	return d
}

func (d *delivery) put(t *testing.T, name, text string) {
	t.Helper()
	if err := os.WriteFile(filepath.Join(d.dir, name), []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

// history is the first file, which the ledger holds before anything is disturbed: 30 days of 25 series.
func (d *delivery) history(t *testing.T, r *rand.Rand) {
	var rows []observed
	for n := range 30 {
		for s := range 25 {
			rows = append(rows, d.observe(r, s, n))
		}
	}
	d.write(t, "2019-01-01.csv", rows)
}

// observe invents a value with eight decimals.
func (d *delivery) observe(r *rand.Rand, series, day int) observed {
	v := r.NormFloat64() * 0.01
	if r.IntN(20) == 0 {
		v *= 8
	}
	return observed{fmt.Sprintf("fund-%02d", series), rules.DateFrom(d.dates[day]), int64(v*1e8) * 1e7}
}

// day is the file of one day; it may bring other values for the two days before it.
func (d *delivery) day(t *testing.T, r *rand.Rand, n int, restates bool) {
	var rows []observed
	for s := range 25 {
		rows = append(rows, d.observe(r, s, n))
		if restates && r.IntN(5) == 0 {
			rows = append(rows, d.observe(r, s, n-1-r.IntN(2)))
		}
	}
	d.write(t, d.dates[n].Format(time.DateOnly)+".csv", rows)
}

func (d *delivery) write(t *testing.T, name string, rows []observed) {
	var text bytes.Buffer
	text.WriteString("date,series,return\n")
	for _, o := range rows {
		fmt.Fprintf(&text, "%s,%s,%s\n", o.date, o.series, rules.Units(o.value))
	}
	d.put(t, "book/"+name, text.String())
	d.files = append(d.files, deliveredFile{name: name, rows: rows})
}

func (d *delivery) large(t *testing.T) {
	text := []byte("date")
	for s := range bigSeries {
		text = append(append(text, ','), bigName(s)...)
	}
	for n := range bigDates {
		text = d.dates[40+n].AppendFormat(append(text, '\n'), time.DateOnly)
		for s := range bigSeries {
			text = append(text, ',')
			text = strconv.AppendFloat(text, float64(bigValue(s, n))/1e13, 'f', 13, 64)
		}
	}
	d.put(t, "large/all.csv", string(append(text, '\n')))
	d.files = append(d.files, deliveredFile{name: "all.csv", wide: true})
}

// undisturbed makes the ledger as it was before, and takes the rest in a process that is left alone.
func (d *delivery) undisturbed(t *testing.T) {
	home := d.home(t, t.TempDir(), false)
	home.must("init")
	set := filepath.Join(d.dir, "aside")
	d.move(t, d.files[1:], filepath.Join(d.dir, "book"), set)
	home.must("pass", "book", "--settled", "--now", crashNow)
	d.move(t, d.files[1:], set, filepath.Join(d.dir, "book"))
	home.must("ledger", "compact") // no room is left in it for what comes
	copyFile(t, filepath.Join(home.path, "ledger.db"), filepath.Join(d.dir, "before.db"))
	start := time.Now()
	if code, text := home.child(t, killAt{after: -1}); code != exitFailed { // for the refused file
		t.Fatalf("exit code %d of a pass that nobody disturbed\n%s", code, text)
	}
	d.lasting = time.Since(start)
	d.flags = home.must("flags", "--all", "--format", "csv")
}

func (d *delivery) move(t *testing.T, files []deliveredFile, from, to string) {
	t.Helper()
	if err := os.MkdirAll(to, 0o755); err != nil {
		t.Fatal(err)
	}
	for _, f := range files {
		if f.wide {
			continue
		}
		if err := os.Rename(filepath.Join(from, f.name), filepath.Join(to, f.name)); err != nil {
			t.Fatal(err)
		}
	}
}

// home is a folder for a ledger that reads the delivery's inboxes; with begun, the ledger as it was before.
func (d *delivery) home(t *testing.T, path string, begun bool) *crashHome {
	t.Helper()
	h := &crashHome{&folder{t, path}, d}
	h.write("strayd.yaml", d.config())
	if begun {
		copyFile(t, filepath.Join(d.dir, "before.db"), filepath.Join(path, "ledger.db"))
	}
	return h
}

func copyFile(t *testing.T, from, to string) {
	t.Helper()
	text, err := os.ReadFile(from)
	if err == nil {
		err = os.WriteFile(to, text, 0o600)
	}
	if err != nil {
		t.Fatal(err)
	}
}

type cellKey struct {
	series string
	date   rules.Date
}

// held is what the first files of the delivery leave: every version of every cell, the large file apart.
func (d *delivery) held(files int) (versions map[cellKey][]int64, large bool) {
	versions = map[cellKey][]int64{}
	for _, f := range d.files[:files] {
		large = large || f.wide
		for _, o := range f.rows {
			k := cellKey{o.series, o.date}
			if v := versions[k]; len(v) == 0 || v[len(v)-1] != o.value {
				versions[k] = append(v, o.value)
			}
		}
	}
	return versions, large
}

// check holds a ledger against the first files of the delivery: every value of them is there, once, and nothing else.
func (d *delivery) check(t *testing.T, v *ledger.View, files int) {
	t.Helper()
	names, err := v.Names()
	if err != nil {
		t.Fatal(err)
	}
	want, large := d.held(files)
	small, big := 0, 0
	err = v.Values(watcher.Returns, func(date rules.Date, id uint32, value int64) error {
		name := string(names.Name(id))
		if versions := want[cellKey{name, date}]; len(versions) > 0 {
			if small++; value != versions[len(versions)-1] {
				return fmt.Errorf("series %s on %s holds %s", name, date, rules.Units(value))
			}
			return nil
		}
		big++
		return d.checkLarge(name, date, value)
	})
	if err != nil {
		t.Fatal(err)
	}
	if small != len(want) || large && big != bigSeries*bigDates || !large && big > 0 {
		t.Fatalf("after %d files %d values of the book are held and %d of the large file; want %d, and all or none (%v)", files, small, big, len(want), large)
	}
	d.checkVersions(t, v, names, want)
}

// checkLarge says whether a value is that of the large file.
func (d *delivery) checkLarge(name string, date rules.Date, value int64) error {
	s, n := 0, int(date-rules.DateFrom(d.dates[40]))
	if _, err := fmt.Sscanf(name, "big-%d", &s); err != nil || n < 0 {
		return fmt.Errorf("series %s on %s holds a value that no file brought", name, date)
	}
	if n = n/7*5 + d.weekday(n%7); value != bigValue(s, n)*100 {
		return fmt.Errorf("series %s on %s holds %s", name, date, rules.Units(value))
	}
	return nil
}

// weekday is how many business days come before so many days after the first date of the large file.
func (d *delivery) weekday(days int) (n int) {
	for i := range days {
		if d.dates[40].AddDate(0, 0, i).Weekday()%6 != 0 {
			n++
		}
	}
	return n
}

func (d *delivery) checkVersions(t *testing.T, v *ledger.View, names *watcher.Names, want map[cellKey][]int64) {
	t.Helper()
	got := map[cellKey][]int64{}
	for s := range 25 {
		name := fmt.Sprintf("fund-%02d", s)
		id, ok := names.Find([]byte(name))
		if !ok {
			t.Fatalf("series %s is not held", name)
		}
		versions, err := v.Series(watcher.Returns, id)
		if err != nil {
			t.Fatal(err)
		}
		for _, x := range versions {
			k := cellKey{name, x.Date}
			got[k] = append(got[k], x.Value)
		}
	}
	for k, w := range want {
		if fmt.Sprint(got[k]) != fmt.Sprint(w) {
			t.Fatalf("series %s on %s has the versions %v, want %v", k.series, k.date, got[k], w)
		}
	}
}
