package main

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"strayd/rules"
	"strayd/rules/drill"
)

// honest prints what the default settings flag and refuse in books without any planted error, unlike those of a drill: of other sizes,
// volatilities, decimals and habits, and the open index data themselves.
func (b *bench) honest() error {
	fmt.Printf("\nhonest books, seeds %d to %d: flags against what is promised (at most 1.5 times), and refused files\n", b.seed, b.seed+uint64(b.seeds)-1)
	fmt.Printf("%-34s %9s %9s %9s %9s %8s %8s  %s\n", "book", "values", "own", "residual", "doubts", "missing", "market", "refused files")
	for _, h := range honestBooks() {
		if b.only != "" && !strings.Contains(h.name, b.only) {
			continue
		}
		var sum honestSum
		for n := range uint64(b.seeds) {
			if err := b.honestBook(&h, b.seed+n, &sum); err != nil {
				return fmt.Errorf("%s, seed %d: %w", h.name, b.seed+n, err)
			}
		}
		sum.print(h.name)
	}
	return nil
}

// honestSum counts over the seeds of a book.
type honestSum struct {
	values, referenced, files int
	kinds                     map[string]int // by kind, breaches by range
	looks                     map[string]int // of doubts, by series that are references or not
	reasons                   []string       // of refusals
}

func (s *honestSum) print(name string) {
	times := func(n, of int, share float64) string {
		if of == 0 {
			return "-"
		}
		return fmt.Sprintf("%.2f", float64(n)/(share*float64(of)))
	}
	doubts := s.kinds["doubtful"] + s.kinds["stale"] + s.kinds["repeat"]
	fmt.Printf("%-34s %9d %9s %9s %9s %8d %8d  %d of %d\n", name, s.values, times(s.kinds["own"], s.values, 0.0027),
		times(s.kinds["residual"], s.referenced, 0.0027), times(doubts, s.values, 0.002), s.kinds["missing"], s.kinds["market-day"],
		s.kinds["refused"], s.files)
	if float64(doubts) > 1.5*0.002*float64(s.values) {
		fmt.Println("    doubts look like", s.looks)
	}
	for _, r := range s.reasons[:min(len(s.reasons), 5)] {
		fmt.Println("    refused:", r)
	}
}

// honestFrom is how many dates come as one file a feed before the others come one by one.
const honestFrom = 260

// honestStep is how many of these one pass takes: the checks of a week run between passes.
const honestStep = 20

func (b *bench) honestBook(h *honestKind, seed uint64, sum *honestSum) error {
	book := h.make(seed)
	dir, err := os.MkdirTemp(b.dir, "honest-")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	d := &desk{bench: b, dir: dir}
	if err := writeSetup(dir, book); err != nil {
		return err
	}
	if err := os.WriteFile(d.path("strayd.yaml"), []byte(honestConfig(book, b.tail)), 0o644); err != nil {
		return err
	}
	if err := d.fresh(); err != nil {
		return err
	}
	from := min(honestFrom, len(book.Dates)/2)
	upto := from
	for begin := 0; begin < len(book.Dates); begin, upto = upto, min(upto+honestStep, len(book.Dates)) {
		if err := d.honestFiles(book, begin, upto, sum); err != nil {
			return err
		}
		last := book.Dates[upto-1].String() + "T20:00:00Z"
		d.run("pass", "--settled", "--now", last) //nolint:errcheck // 1 where a file was refused, which the flags tell
		if err := d.empty(); err != nil {
			return err
		}
	}
	text, _, err := d.output("flags", "--all", "--from", book.Dates[from].String(), "--format", "csv")
	if err != nil {
		return err
	}
	rows, err := named(text)
	if err != nil {
		return err
	}
	sum.take(rows)
	return nil
}

func (s *honestSum) take(rows []cells) {
	if s.kinds == nil {
		s.kinds, s.looks = map[string]int{}, map[string]int{}
	}
	for _, f := range rows {
		kind := f["kind"]
		if kind == "breach" {
			kind = f["range"]
		}
		if kind == "doubtful" || kind == "stale" || kind == "repeat" {
			s.looks[f["looks_like"]]++
		}
		if s.kinds[kind]++; kind == "refused" {
			s.reasons = append(s.reasons, f["file"]+": "+f["note"])
		}
	}
}

// honestFiles writes the dates from..upto, upto excluded: those from the first on as one file a feed, later ones one by one.
func (d *desk) honestFiles(book *drill.Book, from, upto int, sum *honestSum) error {
	step := 1
	if from == 0 {
		step = upto
	}
	for t := from; t < upto; t += step {
		for _, feed := range []string{drill.BenchFeed, drill.FundsFeed} {
			text, rows := book.Text(feed, t, t+step)
			if rows == 0 {
				continue
			}
			if err := os.WriteFile(filepath.Join(d.dir, "inbox", fmt.Sprintf("%s-%s.csv", feed, book.Dates[t])), []byte(text), 0o644); err != nil {
				return err
			}
			if from > 0 {
				sum.files++
			}
		}
		if from > 0 {
			sum.count(book, t)
		}
	}
	return nil
}

// count counts the values of a date.
func (s *honestSum) count(book *drill.Book, t int) {
	for n, u := range book.Values[t] {
		if u == rules.Missing {
			continue
		}
		s.values++
		if of := &book.Series[n]; of.Reference >= 0 || of.Peers {
			s.referenced++
		}
	}
}

// honestConfig is the configuration of a book of any groups.
func honestConfig(b *drill.Book, tail string) string {
	text := "ledger: ledger.db\nfeeds:\n  - {name: index, files: \"inbox/index-*.csv\", unit: percent}\n" +
		"  - {name: administrator, files: \"inbox/administrator-*.csv\", unit: percent}\nseries: series.csv\nevents: events.csv\n"
	var groups []string
	for i := range b.Series {
		s := &b.Series[i]
		line := fmt.Sprintf("  - {name: %s}\n", s.Group)
		if s.Peers {
			line = fmt.Sprintf("  - {name: %s, reference: peers}\n", s.Group)
		}
		if s.Group != "" && !slices.Contains(groups, line) {
			groups = append(groups, line)
		}
	}
	if len(groups) > 0 {
		text += "groups:\n" + strings.Join(groups, "")
	}
	return text + "ranges:\n  - {name: own, tail: " + tail + "}\n  - {name: residual, of: residual, tail: " + tail + "}\n"
}
