package main

import (
	"fmt"
	"os"
	"slices"

	"strayd/rules/drill"
)

// regimes prints what the default settings make of a market day with three series that do not take part, and of a volatility that doubles.
func (b *bench) regimes() error {
	for _, kind := range []string{"funds", "funds-index"} {
		var sum regimeSum
		for n := range uint64(b.seeds) {
			i, err := invention(kind, b.seed+n)
			if err != nil {
				return err
			}
			book := drill.Invent(i)
			if err := b.marketDays(book, &sum); err != nil {
				return err
			}
			if err := b.louder(book, &sum); err != nil {
				return err
			}
		}
		fmt.Printf("\nregimes, book %s, seeds %d to %d\n", kind, b.seed, b.seed+uint64(b.seeds)-1)
		sum.print()
	}
	return nil
}

type regimeSum struct {
	days, told, odd, caught, singles, funds int
	louder                                  map[string]int // breaches by range on days 61 to 120 after
	values                                  int
}

// marketFall is how far the market falls, in deviations.
const marketFall = -4

// marketDays has the market of each group fall on a day of its own, the newest of a history.
func (b *bench) marketDays(book *drill.Book, sum *regimeSum) error {
	fits := drill.NewFits(book)
	for n, group := range drill.GroupNames {
		at := len(book.Dates) - 1 - 20*n
		moved, odd := book.Market(fits, at, group, marketFall)
		flags, err := b.after(moved, at, at+1)
		if err != nil {
			return err
		}
		sum.days++
		seen := map[string]bool{}
		for _, f := range flags {
			switch {
			case f["kind"] == "market-day" && f["group"] == group:
				sum.told++
			case f["series"] != "" && f["group"] == group:
				seen[f["series"]] = true
			}
		}
		for _, s := range odd {
			sum.odd++
			if seen[book.Series[s].ID] {
				sum.caught++
			}
			delete(seen, book.Series[s].ID)
		}
		sum.singles += len(seen)
		sum.funds += 12
	}
	return nil
}

const (
	quietDates = 500 // before the volatility doubles
	settled    = 60  // days after which the rate should be back, and as many in which it is measured
)

func (b *bench) louder(book *drill.Book, sum *regimeSum) error {
	if sum.louder == nil {
		sum.louder = map[string]int{}
	}
	upto := min(len(book.Dates), quietDates+2*settled)
	flags, err := b.after(book.Louder(quietDates), quietDates, upto)
	if err != nil {
		return err
	}
	first := book.Dates[quietDates+settled].String()
	for _, f := range flags {
		if f["kind"] == "breach" && f["date"] >= first {
			sum.louder[f["range"]]++
		}
	}
	sum.values += (upto - quietDates - settled) * len(book.Series)
	return nil
}

// after loads the dates of a book before one, lets those from there up to another come in one file a feed, and lists the flags on them.
func (b *bench) after(book *drill.Book, from, upto int) ([]cells, error) {
	dir, err := os.MkdirTemp(b.dir, "regime-")
	if err != nil {
		return nil, err
	}
	defer os.RemoveAll(dir)
	d := &desk{bench: b, dir: dir}
	if err := writeSetup(dir, book); err != nil {
		return nil, err
	}
	if err := d.fresh(); err != nil {
		return nil, err
	}
	for _, part := range [][2]int{{0, from}, {from, upto}} {
		for _, feed := range []string{drill.BenchFeed, drill.FundsFeed} {
			text, _ := book.Text(feed, part[0], part[1])
			if err := os.WriteFile(d.path(fmt.Sprintf("inbox/%s-%d.csv", feed, part[0])), []byte(text), 0o644); err != nil {
				return nil, err
			}
		}
		if _, err := d.run("pass", "--settled", "--now", book.Dates[part[1]-1].String()+"T17:30:00Z"); err != nil {
			return nil, err
		}
	}
	text, _, err := d.output("flags", "--all", "--from", book.Dates[from].String(), "--format", "csv")
	if err != nil {
		return nil, err
	}
	return named(text)
}

func (s *regimeSum) print() {
	fmt.Printf("a fall of 4 deviations: told by one flag for the group %d of %d; series that did not take part flagged %d of %d; "+
		"others flagged %d of %d\n", s.told, s.days, s.caught, s.odd, s.singles, s.funds)
	var names []string
	for name := range s.louder {
		names = append(names, name)
	}
	slices.Sort(names)
	for _, name := range names {
		fmt.Printf("days 61 to 120 after volatility doubled: range %s, %d breaches of %d, %.2f of what is promised (at most 2)\n", name, s.louder[name],
			s.values, float64(s.louder[name])/(0.0027*float64(s.values)))
	}
}
