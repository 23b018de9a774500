package watcher_test

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

func ranged(name string, change func(*rules.Range)) rules.Range {
	r := rules.Range{Name: name, Of: rules.Return, Window: 20, Scale: rules.Plain, Decay: 0.94, Tail: rules.TailModel{Name: "t", DF: 5}, Predictive: true,
		Side: rules.Both, Watch: rules.Line{Tail: 0.05}, Breach: rules.Line{Tail: 0.01}, Pending: rules.Clip}
	if change != nil {
		change(&r)
	}
	return r
}

// shapes are ranges of every scale, tail and side, with windows at and around what is judged as provisional.
func shapes() []rules.Range {
	normal := rules.TailModel{Name: "normal"}
	return []rules.Range{
		ranged("t5", nil),
		ranged("t3 lower", func(r *rules.Range) { r.Tail.DF, r.Side, r.Window = 3, rules.Lower, 21 }),
		ranged("normal", func(r *rules.Range) { r.Tail, r.Predictive, r.Breach = normal, false, rules.Line{Z: 2.5} }),
		ranged("predictive", func(r *rules.Range) { r.Tail, r.Window = rules.TailModel{Name: "predictive-t"}, 25 }),
		ranged("short", func(r *rules.Range) { r.Window = 7 }),
		ranged("longer than all", func(r *rules.Range) { r.Window, r.Side = 500, rules.Upper }),
		ranged("weighted", func(r *rules.Range) { r.Scale, r.Tail = rules.Weighted, normal }),
		ranged("weighted left out", func(r *rules.Range) { r.Scale, r.Window, r.Decay, r.Pending = rules.Weighted, 10, 0.8, rules.LeaveOut }),
		ranged("mad", func(r *rules.Range) { r.Scale, r.Window = rules.MAD, 24 }),
		ranged("mad kept", func(r *rules.Range) { r.Scale, r.Tail, r.Pending = rules.MAD, normal, rules.Keep }),
		ranged("rank", func(r *rules.Range) {
			r.Tail, r.Breach, r.Watch = rules.TailModel{Name: "rank"}, rules.Line{Tail: 0.1}, rules.Line{Tail: 0.2}
		}),
		ranged("rank of one group", func(r *rules.Range) {
			r.Tail, r.Breach, r.Watch, r.Side = rules.TailModel{Name: "rank"}, rules.Line{Tail: 0.06}, rules.Line{Tail: 0.2}, rules.Upper
			r.For, r.Window = []string{"one"}, 30
		}),
		{Name: "hard", Limit: &rules.Limit{Low: -1e14, High: 2e14}, For: []string{"two", "group0-0000*"}},
	}
}

func groups() []rules.Group {
	return []rules.Group{{Name: "one", Series: []string{"group1-*"}}, {Name: "two", Series: []string{"group2-*"}}}
}

// The pass, which judges most values by gates and windows that roll, against the reader, which goes by the definition of each figure:
// every verdict counted, every flag's figures and every used value, for every scale, tail and side, at the edges of tasks and windows.
func TestPassAgainstDefinition(t *testing.T) {
	for _, c := range []struct {
		series, dates, workers int
		rough                  bool
	}{{63, 32, 1, false}, {64, 30, 2, true}, {65, 30, 3, true}, {12, 70, 2, false}} {
		t.Run(fmt.Sprintf("%d series, %d dates, %d workers, rough %v", c.series, c.dates, c.workers, c.rough), func(t *testing.T) {
			s := &shelf{randomFiles(rand.New(rand.NewPCG(uint64(c.series), uint64(c.dates))), c.series, c.dates, c.rough)}
			settings := rules.Settings{Ranges: shapes(), Groups: groups()}
			d := passed(t, s, settings, c.workers)
			d.counts(s, nil)
			d.flags()
			if !c.rough {
				d.used(&settings)
				d.groups(s, &settings)
			}
		})
	}
}

// A range without a gate makes every value a candidate for all of them; so each is also tried alone. One file holds many dates, so
// that windows roll within a step, or one.
func TestEachRangeAgainstDefinition(t *testing.T) {
	for n, r := range shapes() {
		if r.Limit != nil {
			continue
		}
		for _, dates := range []int{1, 40} {
			t.Run(fmt.Sprintf("%s, %d dates a file", r.Name, dates), func(t *testing.T) {
				s := &shelf{joined(randomFiles(rand.New(rand.NewPCG(uint64(n), uint64(dates))), 70, 80, false), dates)}
				settings := rules.Settings{Ranges: []rules.Range{r}}
				if dates == 1 || r.For != nil { // with groups a provisional value is a candidate too, for what is lent to it
					settings.Groups = groups()
				}
				d := passed(t, s, settings, 2)
				d.counts(s, nil)
				d.flags()
				if r.Pending != rules.Keep {
					d.used(&settings)
				}
			})
		}
	}
}

// Values over several business days, new, late and restated to other days: never in a window, and judged at their length.
func TestSpansAgainstDefinition(t *testing.T) {
	for _, rough := range []bool{false, true} {
		t.Run(fmt.Sprintf("rough %v", rough), func(t *testing.T) {
			r := rand.New(rand.NewPCG(7, 7))
			s := &shelf{randomFiles(r, 66, 60, rough)}
			spans := 0
			for _, name := range sortedFiles(s) {
				for n := range s.files[name] {
					if s.files[name][n].days = 1; r.IntN(12) == 0 {
						s.files[name][n].days = 2 + r.IntN(4)
						spans++
					}
				}
			}
			settings := rules.Settings{Ranges: shapes(), Groups: groups()}
			d := passed(t, s, settings, 2)
			d.counts(s, nil)
			d.flags()
			if !rough {
				d.used(&settings)
			}
			said, left := 0, 0
			d.each(func(rows []watcher.Row) {
				if strings.Contains(rows[0].Why, "covers ") && !strings.Contains(rows[0].Why, "before ") {
					said++
					if rows[0].Used == rules.Missing {
						left++
					}
				}
			})
			if said != left || said == 0 || !rough && said != spans {
				t.Errorf("of %d values over several days, %d are said to be and %d are left out", spans, said, left)
			}
		})
	}
}

// joined puts the rows of so many files into one each.
func joined(files map[string][]entry, most int) map[string][]entry {
	out := map[string][]entry{}
	for n, name := range sortedFiles(&shelf{files}) {
		add(out, n/most, files[name]...)
	}
	return out
}

// passed runs a pass over a shelf and gives its ledger to be held against the definition.
func passed(t *testing.T, s *shelf, settings rules.Settings, workers int) *definition {
	t.Helper()
	m := &memory{}
	run(t, m, s, settings, workers)
	d := newDefinition(t, m)
	if err := watcher.Recheck(d.view, nil); err != nil {
		t.Errorf("the recheck of an honest ledger: %v", err)
	}
	return d
}

// The edges of a block: series on both sides of it, and a file that holds one side only.
func TestPassAtBlockEdge(t *testing.T) {
	if testing.Short() {
		t.Skip("many series")
	}
	for _, series := range []int{watcher.BlockSize, watcher.BlockSize + 1} {
		t.Run(fmt.Sprint(series, " series"), func(t *testing.T) {
			s := &shelf{randomFiles(rand.New(rand.NewPCG(1, uint64(series))), series, 14, false)}
			last := fmt.Sprintf("f%04d", 13)
			s.files[last] = slices.DeleteFunc(s.files[last], func(e entry) bool { return e.series[7:] < fmt.Sprintf("%05d", watcher.BlockSize-1) })
			settings := rules.Settings{Ranges: []rules.Range{ranged("t5", nil), ranged("rank", func(r *rules.Range) {
				r.Tail, r.Breach, r.Watch = rules.TailModel{Name: "rank"}, rules.Line{Tail: 0.1}, rules.Line{Tail: 0.2}
			})}}
			d := passed(t, s, settings, 2)
			d.counts(s, func(file string) bool { return file >= "f0012" })
			d.flags()
		})
	}
}

// definition holds what a pass published against the reader.
type definition struct {
	t      *testing.T
	view   *memoryView
	reader *watcher.Reader
}

func newDefinition(t *testing.T, m *memory) *definition {
	t.Helper()
	v, _ := m.View()
	r, err := watcher.NewReader(v)
	if err != nil {
		t.Fatal(err)
	}
	return &definition{t: t, view: v.(*memoryView), reader: r}
}

// rowsAt are the verdicts of one observation as known at a step.
func (d *definition) rowsAt(series string, date rules.Date, step uint32) []watcher.Row {
	d.t.Helper()
	rows, _, err := d.reader.At(series, date, step)
	if err != nil {
		d.t.Fatal(err)
	}
	return rows
}

// counts compares the counts of every file that keep wants (of all where it is nil) with verdicts recomputed one by one.
func (d *definition) counts(s *shelf, keep func(file string) bool) {
	d.t.Helper()
	files := 0
	for _, b := range d.view.batches {
		if b.File.Outcome != watcher.Accepted || keep != nil && !keep(b.File.File.Name) {
			continue
		}
		files++
		want := watcher.Counts{}
		fresh := 0
		for _, c := range b.Returns {
			vals := make([]int64, c.Len())
			c.Fill(vals, 0, rules.Places)
			for i, x := range vals {
				if x == watcher.Missing64 {
					continue
				}
				fresh++
				name := string(d.reader.Names.Name(c.Block*watcher.BlockSize + uint32(i)))
				for _, row := range d.rowsAt(name, c.Date, b.Step) {
					if !row.Limited {
						tally(&want, &row)
					}
				}
			}
		}
		got := b.File.Counts
		if got.Inside != want.Inside || got.Watch != want.Watch || got.Breach != want.Breach || got.NotJudged != want.NotJudged || got.Provisional != want.Provisional {
			d.t.Fatalf("file %s counts %+v, the definition %+v", b.File.File.Name, got, want)
		}
		if got.New+got.Late+got.Restated != fresh || got.Rows != len(s.files[b.File.File.Name]) || got.Same != got.Rows-fresh {
			d.t.Fatalf("file %s has %d rows, %d fresh values, and counts %+v", b.File.File.Name, len(s.files[b.File.File.Name]), fresh, got)
		}
	}
	if files == 0 {
		d.t.Error("no file was compared")
	}
}

func tally(c *watcher.Counts, row *watcher.Row) {
	switch row.Finding {
	case rules.Inside:
		c.Inside++
	case rules.Watch:
		c.Watch++
	case rules.Breach:
		c.Breach++
	default:
		c.NotJudged++
	}
	if row.Provisional {
		c.Provisional++
	}
}

// flags compares every breach flag, as it was raised, with the row of the range that it names, bit for bit; that row has the smallest
// tail of those that breach.
func (d *definition) flags() {
	d.t.Helper()
	breaches, limits := 0, 0
	for _, b := range d.view.batches {
		for _, f := range b.Flags {
			if f.Step != b.Step || f.Kind != rules.KindBreach && f.Kind != rules.KindLimit {
				continue
			}
			rows := d.rowsAt(f.Series, f.Date, b.Step)
			if f.Kind == rules.KindLimit {
				limits++
				d.limitFlag(f, rows)
				continue
			}
			breaches++
			best := -1
			for n := range rows {
				if !rows[n].Limited && rows[n].Finding == rules.Breach && (best < 0 || rows[n].Log10.V < rows[best].Log10.V) {
					best = n
				}
			}
			if best < 0 || rows[best].Range != f.Range {
				d.t.Fatalf("flag %+v: the definition's rows are %+v", f, rows)
			}
			v := &rows[best].Verdict
			if f.Low != v.Low || f.High != v.High || f.Z != v.Z || f.Tail != v.Tail || f.Log10 != v.Log10 || f.Return != rows[best].Return {
				d.t.Fatalf("flag %+v: the definition says %+v", f, rows[best])
			}
		}
	}
	if breaches == 0 {
		d.t.Errorf("%d breach flags, %d limit flags were compared", breaches, limits)
	}
}

func (d *definition) limitFlag(f *watcher.FlagRow, rows []watcher.Row) {
	d.t.Helper()
	broken := !rules.InWindow(f.Return)
	for _, row := range rows {
		broken = broken || row.Limited && row.Finding == rules.Breach
	}
	if !broken {
		d.t.Fatalf("flag %+v: no limit is broken in %+v", f, rows)
	}
}

// used compares every used value with what the definition makes of the verdicts, where everything came in order.
func (d *definition) used(settings *rules.Settings) {
	d.t.Helper()
	pending := map[string]rules.Pending{}
	for _, r := range settings.Ranges {
		pending[r.Name] = r.Pending
	}
	changed := 0
	d.each(func(rows []watcher.Row) {
		flagged := !rules.InWindow(rows[0].Return)
		var limits []rules.Limit
		for _, row := range rows {
			flagged = flagged || row.Finding == rules.Breach
			if row.Limited {
				limits = append(limits, *settings.Ranges[len(settings.Ranges)-1].Limit) // the only one
			}
		}
		for _, row := range rows {
			if row.Limited {
				continue
			}
			want, ok := row.Return, true
			if flagged {
				want, ok = rules.UsedValue(pending[row.Range], row.Return, &row.Verdict, limits)
			}
			if !ok || strings.Contains(row.Why, "business days") && strings.Contains(row.Why, "covers") {
				want = rules.Missing // no daily value
			}
			if row.Used != want {
				d.t.Fatalf("%+v uses %s, want %s", row, row.Used, want)
			}
			if want != row.Return {
				changed++
			}
		}
	})
	if changed == 0 {
		d.t.Error("every value was used in full")
	}
}

// each calls do with the rows of every observation.
func (d *definition) each(do func([]watcher.Row)) {
	d.t.Helper()
	for id := range uint32(d.reader.Names.Len()) {
		rows, err := d.reader.History(string(d.reader.Names.Name(id)), rules.NoDate, rules.NoDate)
		if err != nil {
			d.t.Fatal(err)
		}
		for from := 0; from < len(rows); {
			to := from
			for to < len(rows) && rows[to].Date == rows[from].Date {
				to++
			}
			do(rows[from:to])
			from = to
		}
	}
}
