package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/rules/causes"
	"strayd/rules/drill"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// drillOptions are what is asked of a drill.
type drillOptions struct {
	seed           uint64
	seeds, days    int
	gap, most      int
	kinds, only    []string
	format, folder string
	plants         string // file for the list of every plant

	chosen   []drill.Kind
	patterns []rules.Pattern
}

func (a *app) drillCommand() *cobra.Command {
	o := &drillOptions{}
	cmd := &cobra.Command{
		Use:   "drill",
		Short: "Planted errors: caught, named, missed, by kind",
		Long: `Plants known errors in a copy of your own history, runs the real pass on it day by day under your settings, and shows which were
caught and named. Nothing that you have is changed: the copy lies in a temporary folder. Prices come as returns.

Errors are drawn at random and far enough apart not to disturb each other; the same seed draws the same. Nobody decides anything meanwhile.
A refused file is sent again as it should have been. What was wrong in your history stays in it and counts as an untouched day.

Kinds: ` + wrapped(drillKinds(), 20) + `

` + drillCaution,
		Example: "  strayd drill\n  strayd drill --kinds x100,sign --seeds 4\n  strayd drill --for equity --days 120 --seed 7 --format csv > drill.csv",
		Args:    takes(0, 0),
		RunE:    func(*cobra.Command, []string) error { return a.drill(o) },
	}
	s := cmd.Flags()
	s.Uint64Var(&o.seed, "seed", 1, "`NUMBER` that fixes where errors are planted")
	s.IntVar(&o.seeds, "seeds", 1, "drill with `N` seeds in a row, from --seed on, and add up")
	s.IntVar(&o.days, "days", 250, "plant in the last `N` dates held")
	s.IntVar(&o.gap, "gap", 60, "business days `N` at least between two plants of a series")
	s.IntVar(&o.most, "most", 0, "at most `N` plants of a kind and seed; 0 for as many as there is room for")
	s.StringSliceVar(&o.kinds, "kinds", nil, "only these `KINDS`, separated by commas")
	s.StringSliceVar(&o.only, "for", nil, "only these `GROUPS`, series or globs of series")
	s.StringVar(&o.folder, "folder", "", "put the copies below this `FOLDER` rather than in the system's")
	s.StringVar(&o.plants, "plants", "", "also list every plant and what became of it, as CSV, into `FILE`")
	s.StringVar(&o.format, "format", "table", "`FORMAT`: table, csv or json")
	return cmd
}

// drillCaution goes with every table of a drill.
const drillCaution = `The figures are about planted errors of these sizes in this past: another error, or another year, may fare otherwise.
` + caution

func drillKinds() (words []string) {
	for _, k := range drill.Kinds {
		words = append(words, string(k))
	}
	return words
}

// wrapped lists words with a line break after every few.
func wrapped(words []string, each int) string {
	var lines []string
	for len(words) > 0 {
		n := min(each, len(words))
		lines = append(lines, strings.Join(words[:n], " "))
		words = words[n:]
	}
	return strings.Join(lines, "\n")
}

func (o *drillOptions) check() error {
	if err := checkFormat(o.format); err != nil {
		return err
	}
	for _, n := range []struct {
		name         string
		value, least int
	}{{"--seeds", o.seeds, 1}, {"--days", o.days, 1}, {"--gap", o.gap, 1}, {"--most", o.most, 0}} {
		if n.value < n.least {
			return usagef("%s %d: need %d or more", n.name, n.value, n.least)
		}
	}
	o.chosen = drill.Kinds
	for i, k := range o.kinds {
		if !drill.Kind(k).Known() {
			return usagef("--kinds %q: need some of %s", k, joinWords(drill.Kinds))
		}
		if i == 0 {
			o.chosen = nil
		}
		o.chosen = append(o.chosen, drill.Kind(k))
	}
	for _, g := range o.only {
		p, err := rules.NewPattern(g)
		if err != nil {
			return usagef("--for %q: %w", g, err)
		}
		o.patterns = append(o.patterns, p)
	}
	return nil
}

func (a *app) drill(o *drillOptions) (err error) {
	if err := o.check(); err != nil {
		return err
	}
	c, err := a.load()
	if err != nil {
		return err
	}
	folder, err := os.MkdirTemp(o.folder, "strayd-drill-")
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, os.RemoveAll(folder)) }()
	b, s, err := a.drillBook(c, o, folder)
	if err != nil {
		return err
	}
	d := &driller{app: a, options: o, config: c, folder: folder, book: b, fits: drill.NewFits(b), from: len(b.Dates) - o.days, bars: newBars(a.err)}
	err = d.all()
	d.bars.clear()
	if err != nil {
		return err
	}
	promises, err := promisesOf(s, b)
	if err != nil {
		return err
	}
	if o.plants != "" {
		if err := d.listPlants(o.plants); err != nil {
			return err
		}
	}
	return d.print(promises)
}

// leastPast is how many dates must lie before the first plant: what a window needs.
const leastPast = 20

// drillBook reads the history, through a running daemon's own backup where one holds the ledger.
func (a *app) drillBook(c *config.Config, o *drillOptions, folder string) (b *drill.Book, s rules.Settings, err error) {
	if s, _, err = settings(c); err != nil {
		return nil, s, err
	}
	l, err := a.heldLedger(c, folder)
	if err != nil {
		return nil, s, err
	}
	b, err = readBook(l, s, o)
	if err = errors.Join(err, l.Close()); err != nil {
		return nil, s, err
	}
	feedsIn(b, c)
	watcher.ResolveBudgets(&s, len(b.Series))
	if have := len(b.Dates); have < leastPast+o.days {
		return nil, s, fmt.Errorf("the ledger holds %s: --days %d needs %d or more", rules.Counted(have, "date"), o.days, leastPast+o.days)
	}
	return b, s, nil
}

func readBook(l *ledger.Ledger, s rules.Settings, o *drillOptions) (*drill.Book, error) {
	v, err := l.View()
	if err != nil {
		return nil, err
	}
	defer v.Close() //nolint:errcheck // only read
	return heldBook(v, s, causes.Memory+o.days, o.patterns)
}

// driller carries out all rounds of a drill.
type driller struct {
	app     *app
	options *drillOptions
	config  *config.Config
	folder  string
	book    *drill.Book
	fits    *drill.Fits
	from    int // index of the first date that may hold a plant
	bars    *bars

	rounds []round
	done   int // dates
}

// round is one plan with the flags that came of it.
type round struct {
	plan  *drill.Plan
	flags []drill.Flag
}

func (d *driller) all() error {
	kinds := drill.Rounds(d.options.chosen)
	base := filepath.Join(d.folder, "base")
	if err := d.base(base); err != nil {
		return err
	}
	total := int64(d.options.seeds * len(kinds) * (len(d.book.Dates) - d.from))
	for n := range d.options.seeds {
		for k, of := range kinds {
			seed := d.options.seed + uint64(n)
			plan := drill.Draw(d.book, d.fits, drill.Options{Seed: seed, Kinds: of, From: d.from, Gap: d.options.gap, Most: d.options.most})
			work := fmt.Sprintf("drilling, seed %d", seed)
			r := d.run(plan, filepath.Join(d.folder, fmt.Sprintf("seed-%d-%d", n, k)), work, total)
			if err := d.play(r, base); err != nil {
				return err
			}
		}
	}
	return nil
}

func (d *driller) run(p *drill.Plan, folder, work string, total int64) *drillRun {
	return &drillRun{ctx: d.app.ctx, config: drillConfig(d.config, folder), folder: folder, truth: d.book, planted: p.Apply(d.book), plan: p,
		make: d.app.newPass, raised: map[time.Time]rules.Date{}, day: func() {
			d.done++
			d.bars.progress(work, int64(d.done), total)
		}}
}

// base makes the ledger that every round begins with: the history before the first plant.
func (d *driller) base(folder string) error {
	d.bars.progress("loading the history", 0, 1)
	r := d.run(&drill.Plan{From: d.from}, folder, "", 0)
	return r.with(ledger.Create, r.load)
}

// play runs one round on a copy of the base, and forgets its folder.
func (d *driller) play(r *drillRun, base string) error {
	if err := r.folders(); err != nil {
		return err
	}
	if err := copyLedger(filepath.Join(base, "ledger.db"), r.config.Ledger); err != nil {
		return err
	}
	err := r.with(ledger.ReadWrite, func() error {
		if err := r.all(); err != nil {
			return err
		}
		flags, err := r.flags()
		d.rounds = append(d.rounds, round{r.plan, flags})
		return err
	})
	return errors.Join(err, os.RemoveAll(r.folder))
}
