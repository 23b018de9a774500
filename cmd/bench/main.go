package main

import (
	"cmp"
	"flag"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"time"
)

// bench is one run of the command.
type bench struct {
	dir     string // for everything that is made, deleted at the end
	program string
	runs    int
	scale   float64
	seed    uint64 // of the first book of funds
	seeds   int    // books of funds that a drill goes through
	tail    string // of the ranges of honest books
	only    string // honest books whose names hold it
}

func main() {
	b := &bench{}
	var rows string
	dir := flag.String("dir", "", "make the files in a new folder below this `DIR`; up to 7 GB at a time")
	flag.IntVar(&b.runs, "runs", 3, "runs of each measurement, of which the median is printed")
	flag.StringVar(&rows, "rows", "all", "which rows, by name, separated by commas: all, "+strings.Join(names(), ", "))
	flag.Float64Var(&b.scale, "scale", 1, "share of the series of every book")
	kind := flag.String("book", "", "write a `BOOK` as files and end: funds, or funds-fx with currencies, or funds-index over the open index data")
	out := flag.String("out", "", "write the book into this `FOLDER`")
	flag.Uint64Var(&b.seed, "seed", 1, "`NUMBER` that fixes the book, and the first of a drill")
	flag.IntVar(&b.seeds, "seeds", 8, "books of a drill")
	flag.StringVar(&b.tail, "tail", "auto", "tail `MODEL` of the ranges of honest books")
	flag.StringVar(&b.only, "only", "", "honest books whose names hold `TEXT`")
	flag.Parse()
	if *kind != "" {
		if err := writeBook(*kind, *out, b.seed); err != nil {
			fmt.Fprintln(os.Stderr, "bench:", err)
			os.Exit(1)
		}
		return
	}
	if err := b.main(*dir, rows); err != nil {
		fmt.Fprintln(os.Stderr, "bench:", err)
		os.Exit(1)
	}
}

func (b *bench) main(dir, rows string) (err error) {
	chosen, err := choose(rows)
	if err != nil {
		return err
	}
	if b.dir, err = os.MkdirTemp(dir, "strayd-bench-"); err != nil {
		return err
	}
	defer os.RemoveAll(b.dir)
	b.program = filepath.Join(b.dir, "strayd")
	build := exec.Command("go", "build", "-o", b.program, "strayd/cmd/strayd")
	build.Stdout, build.Stderr = os.Stderr, os.Stderr
	if err := build.Run(); err != nil {
		return fmt.Errorf("go build: %w", err)
	}
	fmt.Printf("median of %d runs, caches warm, load %s\n", b.runs, load())
	fmt.Println(heading)
	for _, r := range chosen {
		if err := r.measure(b); err != nil {
			return fmt.Errorf("row %s: %w", r.name, err)
		}
	}
	return nil
}

func names() (out []string) {
	for _, r := range rowList() {
		out = append(out, r.name)
	}
	return out
}

func choose(list string) ([]row, error) {
	if list == "all" {
		return rowList(), nil
	}
	var out []row
	for _, name := range strings.Split(list, ",") {
		i := slices.IndexFunc(rowList(), func(r row) bool { return r.name == name })
		if i < 0 {
			return nil, fmt.Errorf("no row %q; there are %s", name, strings.Join(names(), ", "))
		}
		out = append(out, rowList()[i])
	}
	return out, nil
}

// load is how busy the machine is, where it tells.
func load() string {
	text, err := os.ReadFile("/proc/loadavg")
	if err != nil {
		return "not known"
	}
	return string(text[:min(len(text), 14)])
}

// median runs something several times; each run is prepared first, untimed.
func (b *bench) median(prepare func() error, run func() (usage, error)) (usage, error) {
	var all []usage
	for range b.runs {
		if err := prepare(); err != nil {
			return usage{}, err
		}
		u, err := run()
		if err != nil {
			return usage{}, err
		}
		all = append(all, u)
	}
	return usage{
		wall:    middle(all, func(u usage) time.Duration { return u.wall }),
		cpu:     middle(all, func(u usage) time.Duration { return u.cpu }),
		peak:    middle(all, func(u usage) int64 { return u.peak }),
		written: middle(all, func(u usage) int64 { return u.written }),
	}, nil
}

// middle is the median of one figure, the upper of the two middle ones where the runs are even.
func middle[T cmp.Ordered](all []usage, figure func(usage) T) T {
	var list []T
	for _, u := range all {
		list = append(list, figure(u))
	}
	slices.Sort(list)
	return list[len(list)/2]
}
