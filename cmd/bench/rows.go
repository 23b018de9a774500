package main

import (
	"fmt"
	"os"
	"time"
)

// row is one measurement, or one at several sizes.
type row struct {
	name    string
	measure func(*bench) error
}

func rowList() []row {
	return []row{
		{"load", loads("load", 2000, []int{1, 2, 4}, byDate, long, "")},
		{"load50", loads("load", 10000, []int{1}, byDate, long, "")},
		{"series", loads("series order", 2000, []int{1}, bySeries, long, "")},
		{"shuffled", loads("shuffled", 2000, []int{1}, shuffled, long, "")},
		{"series50", loads("series order", 10000, []int{1}, bySeries, long, "")},
		{"shuffled50", loads("shuffled", 10000, []int{1}, shuffled, long, "")},
		{"wide", loads("wide", 2000, []int{1}, byDate, wide, ", layout: wide")},
		{"prices", loads("prices", 2000, []int{1}, byDate, prices, ", value: price")},
		{"gzip", loads("gzip", 2000, []int{1}, byDate, long, "")},
		{"day", (*bench).days},
		{"daemon", (*bench).daemons},
		{"desk", (*bench).pages},
		{"commands", (*bench).commands},
		{"backrun", (*bench).backRuns},
		{"rerun", (*bench).rerun},
		{"age", (*bench).age},
		{"drill", (*bench).drills},
		{"regimes", (*bench).regimes},
		{"honest", (*bench).honest},
	}
}

// history is how many business days a first load brings: 19 years.
const history = 5000

// now is when the passes take place: after every date of every book.
const now = "2026-01-02T08:00:00Z"

var pass = []string{"pass", "--settled", "--now", now}

// loads measures first loads of series by history, at multiples of the series.
func loads(name string, series int, times []int, o order, l layout, feed string) func(*bench) error {
	return func(b *bench) error {
		d, err := b.newDesk(feed)
		if err != nil {
			return err
		}
		for _, n := range times {
			k := book{series: b.share(n * series), dates: history, order: o, layout: l, gzip: name == "gzip"}
			file := "history.csv"
			if k.gzip {
				file += ".gz"
			}
			if err := d.deliver(file, k); err != nil {
				return err
			}
			u, err := b.median(d.fresh, func() (usage, error) { return d.run(pass...) })
			if err != nil {
				return err
			}
			size, err := d.size()
			if err != nil {
				return err
			}
			b.print(figures{row: name, work: fmt.Sprintf("%d x %d", k.series, k.dates), usage: u, rows: k.rows(), bytes: size, held: k.rows()})
		}
		return os.RemoveAll(d.dir)
	}
}

// share is a number of series at the chosen scale.
func (b *bench) share(series int) int { return max(10, int(b.scale*float64(series))) }

// days measures the pass over one day of many series.
func (b *bench) days() error {
	for _, n := range []int{250_000, 500_000, 1_000_000} {
		if err := b.oneDay("one day", b.share(n), []int{80}); err != nil {
			return err
		}
	}
	return nil
}

// age measures the pass over one day in ledgers of different ages.
func (b *bench) age() error { return b.oneDay("age", b.share(100_000), []int{100, 500, 2000}) }

// mostRows is how many rows a file has that only fills a ledger.
const mostRows = 25_000_000

// oneDay fills a ledger up to each number of dates, and measures the day that follows.
func (b *bench) oneDay(name string, series int, ages []int) error {
	d, err := b.newDesk("")
	if err != nil {
		return err
	}
	if err := d.fresh(); err != nil {
		return err
	}
	held := 0
	for _, age := range ages {
		if err := d.fill(series, held, age); err != nil {
			return err
		}
		held = age
		if err := d.keep(); err != nil {
			return err
		}
		k := book{series: series, from: age, dates: 1}
		if err := d.deliver("day.csv", k); err != nil {
			return err
		}
		u, err := b.median(d.back, func() (usage, error) { return d.run(pass...) })
		if err != nil {
			return err
		}
		size, err := d.size()
		if err != nil {
			return err
		}
		b.print(figures{row: name, work: fmt.Sprintf("%d after %d", series, age), usage: u, rows: series, bytes: size, held: (age + 1) * series, disk: true})
		if err := os.Rename(d.path("kept.db"), d.path("ledger.db")); err != nil {
			return err
		}
	}
	return os.RemoveAll(d.dir)
}

// fill brings a ledger from one number of dates to another.
func (d *desk) fill(series, from, to int) error {
	for from < to {
		n := min(to-from, max(1, mostRows/series))
		if err := d.deliver(fmt.Sprintf("fill-%d.csv", from), book{series: series, from: from, dates: n}); err != nil {
			return err
		}
		if _, err := d.run(pass...); err != nil {
			return err
		}
		from += n
	}
	return d.empty()
}

// commands measures what people ask of a ledger of ten million rows.
func (b *bench) commands() error {
	d, k, err := b.tenMillion()
	if err != nil {
		return err
	}
	series := string(name(nil, k.series/2))
	last := day(k.dates - 1).Format(time.DateOnly)
	for _, args := range [][]string{{"flags"}, {"flags", "--all", "--format", "csv"}, {"explain", series, last}, {"history", series},
		{"ranges", series}, {"ranges"}, {"ledger", "verify"}} {
		u, err := b.median(func() error { return nil }, func() (usage, error) { return d.run(args...) })
		if err != nil {
			return err
		}
		f := figures{row: "command", work: fmt.Sprint(args), usage: u}
		if args[0] == "ledger" {
			f.rows = k.rows()
		}
		b.print(f)
	}
	return os.RemoveAll(d.dir)
}

// tenMillion is a desk whose ledger holds ten million rows.
func (b *bench) tenMillion() (*desk, book, error) {
	k := book{series: b.share(2000), dates: history}
	d, err := b.newDesk("")
	if err != nil {
		return nil, k, err
	}
	if err := d.fresh(); err != nil {
		return nil, k, err
	}
	if err := d.deliver("history.csv", k); err != nil {
		return nil, k, err
	}
	if _, err := d.run(pass...); err != nil {
		return nil, k, err
	}
	return d, k, d.empty()
}

// backRuns measures the past judged again: under its own settings, beside others, at a budget, and in a group held against its peers. The
// rows count once a side.
func (b *bench) backRuns() error {
	d, k, err := b.tenMillion()
	if err != nil {
		return err
	}
	line, group := "ranges.own.breach={tail: 0.5%}", `groups=[{name: all, series: ["fund*"], reference: peers}]`
	for _, x := range []struct {
		work  string
		sides int
		args  []string
	}{{"these", 1, nil}, {"these and a line", 2, []string{"--set", line}}, {"all dates compared", 2, []string{"--set", line, "--days", "5000"}},
		{"a budget", 3, []string{"--budget", "100"}}, {"and peers", 2, []string{"--set", group}}} {
		u, err := b.median(func() error { return nil }, func() (usage, error) { return d.run(append([]string{"back-run"}, x.args...)...) })
		if err != nil {
			return err
		}
		b.print(figures{row: "back-run", work: x.work, usage: u, rows: x.sides * k.rows()})
	}
	return os.RemoveAll(d.dir)
}

// rerun measures a pass that has nothing new to take.
func (b *bench) rerun() error {
	d, err := b.newDesk("")
	if err != nil {
		return err
	}
	if err := d.fresh(); err != nil {
		return err
	}
	for n := range 250 {
		k := book{series: b.share(2000), from: n, dates: 1}
		if err := k.write(d.path("inbox/day-" + day(n).Format(time.DateOnly) + ".csv")); err != nil {
			return err
		}
	}
	first, err := d.run(pass...)
	if err != nil {
		return err
	}
	b.print(figures{row: "250 files", work: "each new", usage: first, rows: 250 * b.share(2000), disk: true})
	u, err := b.median(func() error { return nil }, func() (usage, error) { return d.run(pass...) })
	if err != nil {
		return err
	}
	b.print(figures{row: "250 files", work: "nothing new", usage: u, disk: true})
	return os.RemoveAll(d.dir)
}
