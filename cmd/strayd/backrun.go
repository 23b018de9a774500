package main

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/rules/backrun"
	"strayd/watcher"
	"strayd/watcher/desk"
	"strayd/watcher/ledger"
)

// backRunOptions are what is asked of a back-run.
type backRunOptions struct {
	with    string   // file of the other configuration; "" for none
	set     []string // lines of the other configuration
	days    int
	budget  float64
	feed    string // of the files
	changed string // file for the list of what the sides do not flag alike
	format  string
}

func (a *app) backRunCommand() *cobra.Command {
	o := &backRunOptions{}
	cmd := &cobra.Command{
		Use:   "back-run [FILE...]",
		Short: "The past under these settings and others, side by side",
		Long: `Judges everything that the ledger holds once more, under the configuration that is there and under another one, and counts over the last
dates what each flags, whether its lines keep what they promise, and how it stands to what was decided meanwhile. With FILEs, the past is
theirs, read as the feed has it, and the ledger is not looked at. The ledger is never changed.

The other settings are those of --with, with every --set in the place of a line of it. A PATH names keys, and items of a list by their
name: ranges.own.breach={tail: 0.5%}. With --budget, every estimated range of the other settings gets the one breach line that keeps to so
many flags a week; the past is then judged again under it.

` + backRunCaution,
		Example: "  strayd back-run\n  strayd back-run --set 'ranges.own.breach={tail: 0.5%}' --set ranges.own.window=120\n" +
			"  strayd back-run --with tighter.yaml --days 750 --changed changed.csv\n  strayd back-run --budget 2 --format json\n" +
			"  strayd back-run --feed administrator history-2024.csv history-2025.csv",
		Args: takes(0, 1000),
	}
	s := cmd.Flags()
	cmd.RunE = func(_ *cobra.Command, files []string) error {
		if s.Changed("budget") && !(o.budget > 0) {
			return usagef("--budget %v: need a number of flags a week, more than 0", o.budget)
		}
		return a.backRun(o, files)
	}
	s.StringVar(&o.with, "with", "", "the other settings are those of this configuration `FILE`")
	s.StringArrayVar(&o.set, "set", nil, "`PATH=VALUE` in the place of a line of the other settings; may be given again")
	s.IntVar(&o.days, "days", 250, "compare the last `N` dates; those before are judged, and not counted")
	s.Float64Var(&o.budget, "budget", 0, "find the breach line for `N` flags a week")
	s.StringVar(&o.feed, "feed", "", "the `FEED` that FILEs are read as; needed where there are several")
	s.StringVar(&o.changed, "changed", "", "also list what the two do not flag alike, as CSV, into `FILE`")
	s.StringVar(&o.format, "format", "table", "`FORMAT`: table, csv or json")
	return cmd
}

// backRunCaution goes with every table of a back-run.
const backRunCaution = `Lines chosen on a past fit that past: the more settings are tried on it, the more of what the best of them gains is chance.
Decisions are there only for what was flagged when it came; what nobody flagged is in no count (strayd drill plants such errors). They count
from their value's own date on, so the dates until they were made are judged with hindsight. A market day's flags count one by one.
` + caution

func (o *backRunOptions) check(files []string) error {
	switch {
	case o.days < 1:
		return usagef("--days %d: need 1 or more", o.days)
	case o.budget < 0 || o.budget > 1e6:
		return usagef("--budget %v: need a number of flags a week, more than 0", o.budget)
	case o.feed != "" && len(files) == 0:
		return usagef("--feed %s says how FILEs are read: name some", o.feed)
	case o.changed != "" && !o.two():
		return usagef("--changed compares two settings: give --with, --set or --budget")
	}
	return checkFormat(o.format)
}

// two says that there are other settings.
func (o *backRunOptions) two() bool { return o.with != "" || len(o.set) > 0 || o.budget > 0 }

func (a *app) backRun(o *backRunOptions, files []string) (err error) {
	if err := o.check(files); err != nil {
		return err
	}
	c, err := a.load()
	if err != nil {
		return err
	}
	folder, err := os.MkdirTemp("", "strayd-back-run-")
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, os.RemoveAll(folder)) }()
	r := &backRunning{app: a, options: o, config: c, folder: folder, bars: newBars(a.err)}
	err = r.all(files)
	r.bars.clear()
	if err != nil {
		return err
	}
	if o.changed != "" {
		if err := r.listChanges(o.changed); err != nil {
			return err
		}
	}
	return r.print()
}

// backRunning carries a back-run out.
type backRunning struct {
	app     *app
	options *backRunOptions
	config  *config.Config
	folder  string
	bars    *bars

	past    *watcher.Past
	from    rules.Date
	names   []string // of the sides
	unlike  []string // how the second side's settings differ, in words
	kept    []string // ranges that the advised line does not fit
	advice  *backrun.Advice
	compare backrun.Comparison
}

func (r *backRunning) all(files []string) (err error) {
	these, _, err := settings(r.config)
	if err != nil {
		return err
	}
	other, err := r.other(these)
	if err != nil {
		return err
	}
	if r.past, err = r.read(files); err != nil {
		return err
	}
	dates := r.past.Dates
	if len(dates) == 0 {
		return errors.New("there is nothing to judge: no date is held")
	}
	dates = dates[max(0, len(dates)-r.options.days):]
	r.from = dates[0]
	r.compare = backrun.Comparison{Dates: dates, Values: r.past.ValuesFrom(r.from), Issued: r.past.Flags}
	if err := r.judge(r.config.File, these); err != nil || !r.options.two() {
		return err
	}
	return r.second(these, other)
}

// other are the other settings, without the line that a budget asks for.
func (r *backRunning) other(these rules.Settings) (rules.Settings, error) {
	if r.options.with == "" && len(r.options.set) == 0 {
		return these, nil
	}
	path, opt := r.config.File, configOptions()
	if r.options.with != "" {
		path = r.options.with
	}
	opt.Set = r.options.set
	c, err := config.Load(path, opt)
	if errors.Is(err, os.ErrNotExist) {
		return these, badSetting{fmt.Errorf("--with: no configuration %s here", path)}
	}
	if err != nil {
		return these, err
	}
	s, _, err := settings(c)
	return s, err
}

// second judges under the other settings, and under the line that a budget comes to.
func (r *backRunning) second(these, other rules.Settings) error {
	name := r.config.File
	if r.options.with != "" {
		name = r.options.with
	}
	for _, line := range r.options.set {
		name += ", " + line
	}
	first := *r.compare.Sides[0]
	if r.options.with != "" || len(r.options.set) > 0 {
		if err := r.judge(name, other); err != nil {
			return err
		}
	} else {
		r.add(name, &first)
	}
	if r.options.budget > 0 {
		if err := r.advise(name, other); err != nil {
			return err
		}
	}
	r.unlike = rules.Differences(&r.compare.Sides[0].Settings, &r.compare.Sides[1].Settings)
	return nil
}

// mostRounds is how often a line is sought: what the windows take depends on it, so that the tails move a little once it is there.
const mostRounds = 3

// advise looks for the line of the second side, and judges under it.
func (r *backRunning) advise(name string, other rules.Settings) error {
	for range mostRounds {
		side := r.compare.Sides[1]
		advice := side.Advise(r.compare.Dates, r.options.budget)
		if r.advice == nil || advice.Level > 0 {
			r.advice, advice = advice, r.advice
		}
		if r.advice.Level == 0 || advice != nil && advice.Level == r.advice.Level {
			return nil
		}
		var s rules.Settings
		s, r.kept = backrun.Apply(other, r.advice.Level)
		r.names, r.compare.Sides = r.names[:1], r.compare.Sides[:1]
		if err := r.judge(fmt.Sprintf("%s, every breach line at %s", name, rules.InPercentPlain(r.advice.Level)), s); err != nil {
			return err
		}
	}
	return nil
}

// judge judges the past as a new side.
func (r *backRunning) judge(name string, s rules.Settings) error {
	now, err := r.app.now()
	if err != nil {
		return err
	}
	n := len(r.names) + 1
	side, err := r.past.Judge(r.app.ctx, watcher.BackRun{Settings: s, From: r.from, Now: now, Progress: func(work string, done, total int64) {
		r.bars.progress(fmt.Sprintf("%s, side %d", work, n), done, total)
	}})
	if err != nil {
		return err
	}
	r.add(name, side)
	return nil
}

func (r *backRunning) add(name string, s *backrun.Side) {
	r.names, r.compare.Sides = append(r.names, name), append(r.compare.Sides, s)
}

// read reads the past out of the ledger, or out of files.
func (r *backRunning) read(files []string) (p *watcher.Past, err error) {
	var l *ledger.Ledger
	if len(files) > 0 {
		l, err = r.loadFiles(files)
	} else {
		l, err = r.app.heldLedger(r.config, r.folder)
	}
	if err != nil {
		return nil, err
	}
	defer func() { err = errors.Join(err, l.Close()) }()
	v, err := l.View()
	if err != nil {
		return nil, err
	}
	defer v.Close() //nolint:errcheck // only read
	return watcher.ReadPast(r.app.ctx, v, func(done, total int64) { r.bars.progress("reading the past", done, total) })
}

// heldLedger opens the configuration's ledger for reading, through a running daemon's own backup where one holds it.
func (a *app) heldLedger(c *config.Config, folder string) (*ledger.Ledger, error) {
	path := c.Ledger
	if _, there := desk.Path(c.Ledger); there {
		copied := filepath.Join(folder, "daemon.db")
		caller := *a
		caller.args, caller.out = []string{"ledger", "backup", copied}, io.Discard
		done, err := caller.callDaemon()
		if err != nil {
			return nil, err
		}
		if done {
			path = copied
		}
	}
	return ledger.Open(path, ledger.Options{Mode: ledger.ReadOnly})
}

// loadFiles takes files into a ledger of their own, in the order of the dates in their names, without judging them.
func (r *backRunning) loadFiles(files []string) (*ledger.Ledger, error) {
	f, err := r.feedOf()
	if err != nil {
		return nil, err
	}
	l, err := ledger.Open(filepath.Join(r.folder, "files.db"), ledger.Options{Mode: ledger.Create, AnyFilesystem: true, Scratch: true})
	if err != nil {
		return nil, err
	}
	p, err := r.app.newPass(r.config, l)
	if err != nil {
		return nil, errors.Join(err, l.Close())
	}
	p.Source, p.Feeds, p.Settled, p.Tell, p.TellActs = namedFiles{files: files}, []rules.Feed{f}, true, nil, nil
	p.Settings.Ranges, p.Settings.Groups, p.Settings.Doubtful = nil, nil, 0
	p.Settings.Assigned, p.Settings.References, p.Settings.Currencies, p.Settings.Events = nil, nil, nil, nil
	p.Progress = r.bars.progress
	var refused []string
	p.Report = func(f watcher.FileReport) {
		if f.Fate == watcher.FateRefused || f.Fate == watcher.FateWaiting {
			refused = append(refused, f.Why)
		}
	}
	if _, err = p.Run(r.app.ctx); err == nil && len(refused) > 0 {
		err = errors.New(printable(strings.Join(refused, "; ")))
	}
	if err != nil {
		return nil, errors.Join(err, l.Close())
	}
	return l, nil
}

// feedOf is the feed that files are read as.
func (r *backRunning) feedOf() (rules.Feed, error) {
	if r.options.feed == "" && len(r.config.Feeds) == 1 {
		return r.config.Feeds[0], nil
	}
	for _, f := range r.config.Feeds {
		if f.Name == r.options.feed {
			return f, nil
		}
	}
	if r.options.feed == "" {
		return rules.Feed{}, usagef("%s has several feeds: say with --feed as which of them FILEs are read", r.config.File)
	}
	return rules.Feed{}, usagef("no feed %q in %s", r.options.feed, r.config.File)
}
