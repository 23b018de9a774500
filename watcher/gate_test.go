package watcher_test

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// gated is an invented book of a feed: a history, then a file a day.
type gated struct {
	series   int
	dates    []rules.Date
	values   [][]float64 // by date, then series
	factors  [][4]float64
	decimals int
}

// newGated invents series that move with a common factor: 60 of them make four groups of deviation about 1 % a day.
func newGated(seed uint64, series, dates, decimals int) *gated {
	r := rand.New(rand.NewPCG(seed, 4))
	b := &gated{series: series, decimals: decimals}
	first, _ := rules.DateOf(2025, 1, 6)
	slope := make([]float64, series)
	for i := range slope {
		slope[i] = 0.6 + 0.7*r.Float64()
	}
	for n := range dates {
		b.dates = append(b.dates, first+rules.Date(n/5*7+n%5))
		factors := [4]float64{heavy(r), heavy(r), heavy(r), heavy(r)}
		b.factors = append(b.factors, factors)
		row := make([]float64, series)
		for i := range row {
			row[i] = 0.01*slope[i]*factors[i%4] + 0.003*heavy(r)
		}
		b.values = append(b.values, row)
	}
	return b
}

// heavy is a Student t of five degrees of freedom scaled to unit variance.
func heavy(r *rand.Rand) float64 {
	chi := 0.0
	for range 5 {
		n := r.NormFloat64()
		chi += n * n
	}
	return r.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5)
}

// printed is a value as a percent file of so many decimals has it.
func printed(v float64, decimals int) rules.Units {
	scale := math.Pow(10, float64(decimals))
	return rules.Units(math.Round(100*v*scale)) * rules.Units(math.Pow(10, float64(rules.Places-2-decimals)))
}

func (b *gated) file(n int, plant func(i int, v float64) float64) (rows []entry) {
	for i := range b.series {
		rows = append(rows, entry{b.dates[n], fmt.Sprintf("s%03d", i), printed(plant(i, b.values[n][i]), b.decimals), 0})
	}
	return rows
}

// index is the file of the other feed: the four factors themselves.
func (b *gated) index(n int, plant func(i int, v float64) float64) (rows []entry) {
	for i, f := range b.factors[n] {
		rows = append(rows, entry{b.dates[n], fmt.Sprintf("index%d", i), printed(plant(i, 0.01*f), 4), 0})
	}
	return rows
}

// references names for every series the index of its factor.
func (b *gated) references() map[string]string {
	of := map[string]string{}
	for i := range b.series {
		of[fmt.Sprintf("s%03d", i)] = fmt.Sprintf("index%d", i%4)
	}
	return of
}

func same(_ int, v float64) float64 { return v }

func scaled(by float64) func(int, float64) float64 {
	return func(_ int, v float64) float64 { return by * v }
}

// desk is a store that a book is given to, day by day.
type desk struct {
	t        *testing.T
	store    *memory
	settings rules.Settings
	released map[[32]byte]bool
	reports  []watcher.FileReport
	now      rules.Date // 0 for the newest date of the file
}

func newDesk(t *testing.T) *desk {
	return &desk{t: t, store: &memory{}, settings: rules.Settings{Calendar: "weekdays", Ranges: []rules.Range{ownRange()}}}
}

func ownRange() rules.Range {
	return rules.Range{Name: "own", Of: rules.Return, Window: 60, Scale: rules.Plain, Tail: rules.TailModel{Name: "t", DF: 5}, Predictive: true,
		Side: rules.Both, Watch: rules.Line{Tail: 0.01}, Breach: rules.Line{Tail: 0.0027}, Pending: rules.Clip}
}

// give is one pass over one file.
func (d *desk) give(feed, name string, rows []entry) {
	d.t.Helper()
	now := max(d.now, rows[len(rows)-1].date)
	for _, e := range rows {
		now = max(now, e.date)
	}
	p := &watcher.Pass{Store: d.store, Source: &shelf{files: map[string][]entry{name: rows}}, Settings: d.settings,
		Feeds: []rules.Feed{{Name: feed, DateStyle: "DD/MM/YYYY"}}, FeedKey: func(rules.Feed) string { return "key" },
		Now: now.Time().Add(18 * time.Hour), Settled: true, Workers: 1, Released: d.released,
		Report: func(r watcher.FileReport) { d.reports = append(d.reports, r) }}
	if _, err := p.Run(context.Background()); err != nil {
		d.t.Fatal(err)
	}
}

func (b *gated) history(n int) (rows []entry) {
	for k := range n {
		rows = append(rows, b.file(k, same)...)
	}
	return rows
}

// load gives a desk the first n dates as a history, then files a day up to the date upto.
func (b *gated) load(d *desk, n, upto int) {
	d.t.Helper()
	d.give("funds", "history.csv", b.history(n))
	for k := n; k < upto; k++ {
		d.give("funds", dayName(b.dates[k]), b.file(k, same))
	}
}

func dayName(d rules.Date) string { return "returns-" + d.String() + ".csv" }

// raised are the flags of whole files since a step, as "kind looks-like".
func (d *desk) raised(since int) (out []string) {
	for _, b := range d.store.batches[since:] {
		for _, f := range b.Flags {
			if f.SeriesID == watcher.NoSeries {
				out = append(out, strings.TrimSpace(string(f.Kind)+" "+string(f.LooksLike)))
			}
		}
	}
	return out
}

// reasons are why files were refused.
func (d *desk) reasons() (out []string) {
	for _, r := range d.reports {
		if r.Fate == watcher.FateRefused {
			out = append(out, r.Why)
		}
	}
	return out
}

// Each planted fault of a whole file raises one flag of the right kind, that says what it looks like; nothing of a refused file is kept.
func TestGateOfAFile(t *testing.T) {
	b := newGated(1, 60, 90, 4)
	whole := b.file(80, same)
	other := func(rows []entry, date rules.Date) []entry {
		rows = slices.Clone(rows)
		for i := range rows {
			rows[i].date = date
		}
		return rows
	}
	saturday := b.dates[79] + 1 // dates[79] is a Friday
	tests := []struct {
		name string
		rows []entry
		want string
	}{
		{"whole", whole, ""},
		{"times 100", b.file(80, scaled(100)), "refused x100"},
		{"times 10,000", b.file(80, scaled(10000)), "refused x10000"},
		{"a hundredth", b.file(80, scaled(0.01)), "refused div100"},
		{"all zero", b.file(80, scaled(0)), "refused zero"},
		{"the date before again", other(b.file(79, same), b.dates[80]), "refused repeat"},
		{"cut short", whole[:50], "refused"},
		{"cut by one", whole[:59], "missing"},
		{"a few missing", slices.Delete(slices.Clone(whole), 20, 25), "missing"},
		{"on a Saturday", other(whole, saturday), "refused"},
		{"one row on a Saturday", append(slices.Clone(whole), entry{saturday, "s005", 1e12, 0}), "refused"},
		{"one row of years before", append(slices.Clone(whole), entry{b.dates[0] - 700, "s005", 1e12, 0}), "refused"},
		{"day and month exchanged", other(whole, b.dates[80]), ""}, // 28 April cannot be read otherwise
		{"a new series", append(slices.Clone(whole), entry{b.dates[80], "t000", 1e12, 0}), ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			d := newDesk(t)
			b.load(d, 70, 80)
			since := len(d.store.batches)
			d.give("funds", dayName(b.dates[80]), tt.rows)
			if got := strings.Join(d.raised(since), ", "); got != tt.want {
				t.Errorf("raised %q, want %q: %s", got, tt.want, d.reports[len(d.reports)-1].Why)
			}
			last := d.store.batches[len(d.store.batches)-1]
			if refused := strings.HasPrefix(tt.want, "refused"); refused != (len(last.Returns) == 0) {
				t.Errorf("%d columns stored", len(last.Returns))
			}
		})
	}
}

// Over invented books of ordinary files none is refused, and no flag of a whole file is raised.
func TestGateOfOrdinaryFiles(t *testing.T) {
	if testing.Short() {
		t.Skip("many passes")
	}
	seeds := uint64(6)
	if testing.Short() {
		seeds = 2
	}
	for seed := range seeds {
		for _, decimals := range []int{2, 4} {
			b := newGated(100+seed, []int{20, 12, 60}[seed%3], 220, decimals)
			d := newDesk(t)
			b.load(d, 60, len(b.dates))
			if got := d.raised(0); len(got) > 0 {
				t.Errorf("seed %d, %d decimals: raised %v", seed, decimals, got)
			}
		}
	}
}

// A day of which no file comes is flagged with the next file, once; a holiday of the calendar is not.
func TestDayWithoutAFile(t *testing.T) {
	b := newGated(5, 24, 90, 4)
	for _, holiday := range []bool{false, true} {
		d := newDesk(t)
		if holiday {
			d.settings.Calendar = "here"
			d.settings.Calendars = map[string]*rules.Calendar{"here": rules.NewCalendar(0, []rules.Date{b.dates[80]}, nil)}
		}
		b.load(d, 70, 80)
		since := len(d.store.batches)
		d.give("funds", dayName(b.dates[81]), b.file(81, same))
		d.give("funds", dayName(b.dates[82]), b.file(82, same))
		want := 1
		if holiday {
			want = 0
		}
		if got := d.raised(since); len(got) != want || want == 1 && got[0] != "missing" {
			t.Errorf("holiday %v: raised %v", holiday, got)
		}
		if holiday { // a file for the holiday is refused
			since = len(d.store.batches)
			d.give("funds", dayName(b.dates[80]), b.file(80, same))
			if got := d.raised(since); len(got) != 1 || got[0] != "refused" {
				t.Errorf("on the holiday: raised %v", got)
			}
		}
	}
}

// A refused file is passed over until its content is released or the calendar changes; then it is taken.
func TestRefusedFileIsTriedAgain(t *testing.T) {
	b := newGated(6, 24, 90, 4)
	bad := b.file(80, scaled(100))
	saturday := b.dates[79] + 1
	closed := b.file(80, same)
	for i := range closed {
		closed[i].date = saturday
	}
	for _, tt := range []struct {
		name  string
		rows  []entry
		again func(d *desk)
	}{
		{"released", bad, func(d *desk) {
			last := d.store.batches[len(d.store.batches)-1]
			d.released = map[[32]byte]bool{last.File.File.SHA256: true}
		}},
		{"calendar", closed, func(d *desk) {
			d.settings.Calendar = "open"
			d.settings.Calendars = map[string]*rules.Calendar{"open": rules.NewCalendar(0b1111110, nil, nil)}
		}},
	} {
		d := newDesk(t)
		b.load(d, 70, 80)
		d.give("funds", "a.csv", tt.rows)
		d.give("funds", "a.csv", tt.rows)
		if n := len(d.reports); d.reports[n-2].Fate != watcher.FateRefused || d.reports[n-1].Fate != watcher.FateSeen {
			t.Errorf("%s: %v, %v", tt.name, d.reports[n-2], d.reports[n-1])
		}
		tt.again(d)
		d.give("funds", "a.csv", tt.rows)
		d.give("funds", "a.csv", tt.rows)
		if n := len(d.reports); d.reports[n-2].Fate != watcher.FateAccepted || d.reports[n-1].Fate != watcher.FateSeen {
			t.Errorf("%s: then %v, %v", tt.name, d.reports[n-2], d.reports[n-1])
		}
	}
}

// A file that was to be read with the month first: on the 4th of March 2025 it is for the 3rd of April. Checked by hand: both are business
// days, and the newest held is Wednesday the 2nd of April.
func TestDayAndMonthExchanged(t *testing.T) {
	b := newGated(7, 24, 64, 4)
	march, _ := rules.DateOf(2025, 3, 4)
	april, _ := rules.DateOf(2025, 4, 3)
	if b.dates[63] != april {
		t.Fatalf("the book has %s", b.dates[63])
	}
	d := newDesk(t)
	b.load(d, 50, 63)
	since := len(d.store.batches)
	rows := b.file(63, same)
	for i := range rows {
		rows[i].date = march
	}
	d.now = april
	d.give("funds", dayName(april), rows)
	if got := d.raised(since); len(got) != 1 || got[0] != "refused" || !strings.Contains(d.reasons()[0], "Thu 2025-04-03") {
		t.Errorf("raised %v: %v", got, d.reasons())
	}
	d.give("funds", "correction-"+dayName(april), rows[:3]) // of few rows: meant
	if got := d.raised(since); len(got) != 1 {
		t.Errorf("then raised %v: %v", got, d.reasons())
	}
}

// A history whose values are as they were held but for a hundredth of their size is refused.
func TestWrongSizeOfManyDates(t *testing.T) {
	b := newGated(8, 24, 90, 4)
	d := newDesk(t)
	b.load(d, 70, 75)
	var rows []entry
	for k := 75; k < 80; k++ {
		rows = append(rows, b.file(k, scaled(0.01))...)
	}
	since := len(d.store.batches)
	d.give("funds", "week.csv", rows)
	if got := d.raised(since); len(got) != 1 || got[0] != "refused div100" {
		t.Errorf("raised %v: %v", got, d.reasons())
	}
}
