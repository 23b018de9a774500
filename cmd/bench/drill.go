package main

import (
	"encoding/csv"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"strayd/rules/drill"
)

// drills prints what the default settings catch and name on invented books, by the real program: the table of the issue with its floors.
func (b *bench) drills() error {
	currencies := []drill.Kind{drill.FXMissing, drill.FXTwice}
	var plain []drill.Kind
	for _, k := range drill.Kinds {
		if !slices.Contains(currencies, k) {
			plain = append(plain, k)
		}
	}
	for _, of := range []struct {
		book  string
		kinds []drill.Kind
	}{{"funds", plain}, {"funds-index", plain}, {"funds-fx", currencies}} {
		if err := b.drillBook(of.book, of.kinds); err != nil {
			return err
		}
	}
	return nil
}

// drillSum is what all seeds of a book add up to.
type drillSum struct {
	floors []drill.Row
	quiet  map[string]*drill.Quiet
	names  []string // of the lines on untouched days, in order
}

func (b *bench) drillBook(kind string, kinds []drill.Kind) error {
	sum := &drillSum{floors: make([]drill.Row, len(drill.Floors())), quiet: map[string]*drill.Quiet{}}
	for n := range uint64(b.seeds) {
		seed := b.seed + n
		i, err := invention(kind, seed)
		if err != nil {
			return err
		}
		if err := b.drillSeed(drill.Invent(i), seed, kinds, sum); err != nil {
			return fmt.Errorf("%s, seed %d: %w", kind, seed, err)
		}
	}
	fmt.Printf("\ndrill, book %s, seeds %d to %d. Floors in brackets; per cent of those planted, and of those caught.\n", kind, b.seed,
		b.seed+uint64(b.seeds)-1)
	sum.print()
	return nil
}

// drillSeed makes a book's files, loads them and runs the program's drill on them.
func (b *bench) drillSeed(book *drill.Book, seed uint64, kinds []drill.Kind, sum *drillSum) error {
	dir, err := os.MkdirTemp(b.dir, "drill-")
	if err != nil {
		return err
	}
	defer os.RemoveAll(dir)
	d := &desk{bench: b, dir: dir}
	if err := writeSetup(dir, book); err != nil {
		return err
	}
	for _, feed := range []string{drill.BenchFeed, drill.FundsFeed} {
		text, _ := book.Text(feed, 0, len(book.Dates))
		if err := os.WriteFile(d.path("inbox/"+feed+"-history.csv"), []byte(text), 0o644); err != nil {
			return err
		}
	}
	if err := d.fresh(); err != nil {
		return err
	}
	if _, err := d.run("pass", "--settled", "--now", now); err != nil {
		return err
	}
	words := make([]string, len(kinds))
	for i, k := range kinds {
		words[i] = string(k)
	}
	table, _, err := d.output("drill", "--seed", strconv.FormatUint(seed, 10), "--kinds", strings.Join(words, ","), "--plants", d.path("plants.csv"),
		"--format", "csv")
	if err != nil {
		return err
	}
	if err := sum.lines(table); err != nil {
		return err
	}
	plants, err := os.ReadFile(filepath.Join(dir, "plants.csv"))
	if err != nil {
		return err
	}
	return sum.plants(book, string(plants))
}

// plants adds the plants that the program lists.
func (s *drillSum) plants(b *drill.Book, text string) error {
	rows, err := named(text)
	if err != nil {
		return err
	}
	var all []drill.Outcome
	for _, r := range rows {
		p := drill.Plant{Kind: drill.Kind(r["kind"]), Feed: r["feed"], Left: r.number("left")}
		p.Series = slices.IndexFunc(b.Series, func(x drill.Series) bool { return x.ID == r["series"] })
		o := drill.Outcome{Plant: &p, Within: -1, Flags: int(r.number("flags")), Followed: int(r.number("followed"))}
		if r["within"] != "" {
			o.Within = int(r.number("within"))
		}
		o.Naming = map[string]drill.Naming{"right": drill.Right, "wrong": drill.Wrong}[r["named"]]
		all = append(all, o)
	}
	for i, f := range drill.Floors() {
		s.floors[i].Sum(f.Count(b, all))
	}
	return nil
}

// lines adds the program's counts on untouched days.
func (s *drillSum) lines(text string) error {
	rows, err := named(text)
	if err != nil {
		return err
	}
	for _, r := range rows {
		if r["by"] != "untouched" {
			continue
		}
		q, ok := s.quiet[r["name"]]
		if !ok {
			q = &drill.Quiet{Name: r["name"]}
			s.quiet[q.Name] = q
			s.names = append(s.names, q.Name)
		}
		q.Flags += int(r.number("flags"))
		q.Values += int(r.number("values"))
		q.Promised += r.number("promised")
	}
	return nil
}

func (s *drillSum) print() {
	fmt.Printf("%-50s %7s  %-15s %-15s %-14s %s\n", "planted", "number", "caught", "named rightly", "wrongly", "beside")
	for i, f := range drill.Floors() {
		r := &s.floors[i]
		if r.Planted == 0 {
			continue
		}
		beside := ""
		if f.Single > 0 {
			beside = "one flag " + against(r.Single, r.Planted, f.Single, false)
		}
		if f.Followed > 0 {
			beside = fmt.Sprintf("flags on followers a day %.2f (at most %g)", float64(r.Followed)/float64(r.Planted), f.Followed)
		}
		of := r.Right + r.Wrong + r.Not
		fmt.Printf("%-50s %7d  %-15s %-15s %-14s %s\n", f.Name, r.Planted, against(f.CaughtIn(r), r.Planted, f.Caught, false),
			against(r.Right, of, f.Right, false), against(r.Wrong, of, f.Wrong, true), beside)
	}
	for _, name := range s.names {
		q := s.quiet[name]
		ratio := ""
		if q.Promised > 0 {
			ratio = fmt.Sprintf("  %.2f of what is promised (at most 1.5)", float64(q.Flags)/q.Promised)
		}
		fmt.Printf("untouched days: %-34s %7d of %d%s\n", name, q.Flags, q.Values, ratio)
	}
}

// against writes a share beside its floor, with a mark where it falls short of it.
func against(n, of int, floor float64, most bool) string {
	share, ok := drill.Share(n, of)
	if !ok {
		return "-"
	}
	out := fmt.Sprintf("%.1f", 100*share)
	if floor > 0 {
		out += fmt.Sprintf(" (%g)", floor)
		if short := 100*share < floor-1e-9; short && !most || most && 100*share > floor+1e-9 {
			out += " !"
		}
	}
	return out
}

// cells is a row of a listing by the names of its columns.
type cells map[string]string

func (c cells) number(name string) float64 {
	v, _ := strconv.ParseFloat(c[name], 64) // empty where it does not apply
	return v
}

func named(text string) (out []cells, err error) {
	rows, err := csv.NewReader(strings.NewReader(text)).ReadAll()
	if err != nil || len(rows) == 0 {
		return nil, err
	}
	for _, row := range rows[1:] {
		c := cells{}
		for i, name := range rows[0] {
			c[name] = row[i]
		}
		out = append(out, c)
	}
	return out, nil
}
