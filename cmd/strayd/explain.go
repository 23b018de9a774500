package main

import (
	"fmt"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
)

func (a *app) explainCommand() *cobra.Command {
	var format, rangeName string
	cmd := &cobra.Command{
		Use:   "explain REF | SERIES DATE",
		Short: "Every figure behind a verdict, recomputed",
		Long: `Recomputes one verdict from the returns held, as they were known when it was given, and lists its window and versions.
Without --range, the range of the flag, or the one whose verdict weighs most, is explained.

` + caution,
		Example: "  strayd explain 12\n  strayd explain alder-income 2026-03-13 --format json",
		Args:    takes(1, 2),
		RunE: func(_ *cobra.Command, args []string) error {
			if err := checkFormat(format); err != nil {
				return err
			}
			return a.reading(func(c *config.Config, v watcher.View) error { return a.explain(c, v, args, rangeName, format) })
		},
	}
	cmd.Flags().StringVar(&rangeName, "range", "", "explain the verdict under this `RANGE`")
	cmd.Flags().StringVar(&format, "format", "table", "`FORMAT`: table, csv or json")
	return beside(cmd)
}

// explained is one verdict with all that stands behind it.
type explained struct {
	row      watcher.Row
	versions []watcher.Version
	flag     *rules.Flag
	beside   []string           // where none was asked for by its ref: the flags of the date, in words
	limits   []string           // that the value breaks as well, in words
	weighed  *watcher.Reweighed // nil for a series that is not weighed together with others
}

func (a *app) explain(c *config.Config, v watcher.View, args []string, rangeName, format string) error {
	r, err := watcher.NewReader(v)
	if err != nil {
		return err
	}
	e, err := findExplained(r, args, rangeName)
	if err == nil {
		err = e.weigh(r)
	}
	if err != nil {
		return notFound(err)
	}
	if e.flag != nil && e.flag.Series == "" {
		if format == "table" {
			return firstError(a.explainFile(r, e.flag), a.explainFileTurns(r, e.flag))
		}
		return fmt.Errorf("flag %d is about file %s, not an observation: see `strayd flags --all --format %s`", e.flag.Ref, e.flag.File, format)
	}
	switch format {
	case "csv":
		l, err := newListing(a.out, format, historyColumns)
		return firstError(err, l.row(historyCells(&e.row)...), l.end())
	case "json":
		return a.explainJSON(r, e)
	}
	return a.explainTable(r, e)
}

func findExplained(r *watcher.Reader, args []string, rangeName string) (*explained, error) {
	if len(args) == 2 {
		d, err := rules.ParseDate(args[1])
		if err != nil {
			return nil, usageError{err}
		}
		e, err := explainObservation(r, args[0], d, ^uint32(0), rangeName, nil)
		if err == nil {
			e.beside, err = flagsOn(r.View, args[0], d)
		}
		return e, err
	}
	ref, err := strconv.ParseUint(args[0], 10, 64)
	if err != nil {
		return nil, usagef("%q is not a ref; for an observation give SERIES and DATE", args[0])
	}
	f, ok, err := r.View.Flag(ref)
	if err != nil {
		return nil, err
	}
	if !ok {
		return nil, &watcher.UnknownRef{Ref: ref}
	}
	if f.Series == "" {
		return &explained{flag: &f}, nil
	}
	if rangeName == "" {
		rangeName = f.Range
	}
	return explainObservation(r, f.Series, f.Date, f.Step, rangeName, &f)
}

func explainObservation(r *watcher.Reader, series string, d rules.Date, asOf uint32, rangeName string, f *rules.Flag) (*explained, error) {
	rows, versions, err := r.At(series, d, asOf)
	if err != nil {
		return nil, err
	}
	if len(rows) == 0 {
		return nil, fmt.Errorf("no range judges series %q", series)
	}
	at := heaviest(rows)
	if rangeName != "" {
		at = -1
		for i := range rows {
			if rows[i].Range == rangeName {
				at = i
			}
		}
	}
	if at < 0 {
		return nil, fmt.Errorf("no range %q judged series %q on %s", rangeName, series, d)
	}
	e := &explained{row: rows[at], versions: versions, flag: f}
	for i := range rows {
		if row := &rows[i]; f == nil && i != at && row.Limited && row.Finding == rules.Breach {
			e.limits = append(e.limits, fmt.Sprintf("limit %s, which allows %s", row.Range, between(row.Low, row.High)))
		}
	}
	return e, nil
}

// flagsOn are the flags of a series on a date, in words.
func flagsOn(v watcher.View, series string, d rules.Date) (words []string, err error) {
	names, err := v.Names()
	if err != nil {
		return nil, err
	}
	id, ok := names.Find([]byte(series))
	for _, kind := range rules.Kinds {
		if !ok {
			break
		}
		f, ok, err := v.FlagAt(id, d, kind)
		if err != nil {
			return nil, err
		}
		if ok {
			words = append(words, fmt.Sprintf("ref %d (%s, %s)", f.Ref, f.Kind, f.Standing))
		}
	}
	return words, nil
}

// weigh makes the weighing of the value again. It reads the past of every series that is weighed together with it.
func (e *explained) weigh(r *watcher.Reader) (err error) {
	if e.row.Series != "" {
		e.weighed, err = r.Weigh(e.row.Series, e.row.Date, e.row.Step)
	}
	return err
}

// heaviest is the row to explain when none is asked for: the worst verdict, and of equal ones the smallest tail.
func heaviest(rows []watcher.Row) int {
	weight := map[rules.Finding]int{rules.Breach: 3, rules.Watch: 2, rules.Inside: 1}
	best := 0
	for i := range rows {
		a, b := &rows[i], &rows[best]
		if w, v := weight[a.Finding], weight[b.Finding]; w > v || w == v && !a.Limited && (b.Limited || a.Log10.V < b.Log10.V) {
			best = i
		}
	}
	return best
}

func (a *app) explainJSON(r *watcher.Reader, e *explained) error {
	var window, versions []string
	for _, u := range e.row.Window {
		window = append(window, object([]string{"date", "return", "used"}, []cell{date(u.Date), units(u.Return), units(u.Used)}, "    ", " "))
	}
	for _, v := range e.versions {
		file, err := r.File(v.Step)
		if err != nil {
			return err
		}
		versions = append(versions, object([]string{"return", "received", "file", "line"},
			[]cell{units(rules.Units(v.Value)), moment(file.Received), text(file.File.Name), integer(v.Line)}, "    ", " "))
	}
	names := strings.Split(historyColumns, ",")
	var b strings.Builder
	b.WriteString("{\n")
	for i, c := range historyCells(&e.row) {
		fmt.Fprintf(&b, "  %q: %s,\n", names[i], c.json)
	}
	standings, err := turnsJSON(r, e.flag)
	if err != nil {
		return err
	}
	fmt.Fprintf(&b, "  \"window\": %s,\n  \"reference\": %s,\n  \"causes\": %s,\n  \"versions\": %s,\n  \"standings\": %s\n}\n", array(window),
		e.reference(), array(e.causes()), array(versions), standings)
	_, err = a.out.Write([]byte(b.String()))
	return err
}

func array(objects []string) string {
	if len(objects) == 0 {
		return "[]"
	}
	return "[\n" + strings.Join(objects, ",\n") + "\n  ]"
}

// explainFile explains a flag that is about a file or a feed, not an observation.
func (a *app) explainFile(r *watcher.Reader, f *rules.Flag) error {
	at := f.RaisedAt.Format(time.RFC3339)
	if f.Kind == rules.KindMarketDay {
		fmt.Fprintf(a.out, "Ref %d: market day of group %s, median %s for %s (raised %s, %s).\n  %s\n", f.Ref, printable(f.Group), rules.InPercent(f.Return.Float()),
			day(f.Date), at, f.Standing, printable(f.Note))
		fmt.Fprintf(a.out, "Its breaches: strayd flags --all --date %s --group %q\n", f.Date, printable(f.Group))
		return nil
	}
	if f.Kind == rules.KindLate {
		fmt.Fprintf(a.out, "Ref %d: feed %s was not whole for %s when its deadline passed (raised %s).\n  %s\n", f.Ref, f.Feed, day(f.Date), at, printable(f.Note))
		fmt.Fprintln(a.out, "What has come since is in `strayd flags` and `strayd history SERIES`.")
		return nil
	}
	fmt.Fprintf(a.out, "Ref %d: file %s of feed %s was refused on %s, and nothing of it is kept.\n  %s\n", f.Ref, printable(f.File), f.Feed, at,
		printable(f.Note))
	again := "It is tried again when its content or the feed's settings change"
	row, err := r.File(f.Step)
	if err == nil && row.Gated() {
		again += ", or when somebody releases it: strayd accept " + printable(f.File) + " --note WHY"
	}
	fmt.Fprintln(a.out, again+".")
	return err
}

func (a *app) explainTable(r *watcher.Reader, e *explained) error {
	fmt.Fprintln(a.out, e.headline())
	w := columns(a.out)
	line := func(name, format string, args ...any) { fields(w, "  "+name, fmt.Sprintf(format, args...)) }
	if err := firstError(e.evidence(line, r), w.Flush()); err != nil {
		return err
	}
	fmt.Fprintln(a.out, "\n"+caution)
	return nil
}

// headline is the verdict in a line.
func (e *explained) headline() string {
	row, ref := &e.row, ""
	if e.flag != nil {
		ref = fmt.Sprintf(", ref %d (%s, %s)", e.flag.Ref, e.flag.Kind, e.flag.Standing)
	}
	return fmt.Sprintf("%s  %s  for %s: %s under range %q%s", printable(row.Series), rules.InPercent(row.Return.Float()),
		row.Date.Time().Format("Monday 2006-01-02"), row.Finding, row.Range, ref)
}

// evidence says, line by line, all that stands behind a verdict.
func (e *explained) evidence(line func(name, format string, args ...any), r *watcher.Reader) error {
	row := &e.row
	if e.flag != nil && e.flag.Kind.Slow() {
		line("flagged", "%s", printable(e.flag.Note))
	}
	if len(e.beside) > 0 {
		line("flagged", "%s", strings.Join(e.beside, ", "))
	}
	if len(e.limits) > 0 {
		line("also breaks", "%s", printable(strings.Join(e.limits, "; ")))
	}
	if row.Why != "" {
		line("why", "%s", printable(row.Why))
	}
	if row.Low.OK || row.High.OK {
		line("expected", "%s", between(row.Low, row.High))
	}
	if row.WatchLow.OK || row.WatchHigh.OK {
		line("watched beyond", "%s", between(row.WatchLow, row.WatchHigh))
	}
	e.explainWeighing(line)
	if !row.Limited {
		decided, err := r.Decided(row.Series, row.Date)
		if err != nil {
			return err
		}
		explainWindow(line, row, e.versions[len(e.versions)-1].Step > row.Step, decided)
	}
	for i, v := range e.versions {
		file, err := r.File(v.Step)
		if err != nil {
			return err
		}
		name := "received"
		if i > 0 {
			name = "restated"
		}
		line(name, "%s as %s in %s, line %d (feed %s)", file.Received.Format(time.RFC3339), rules.Units(v.Value), printable(file.File.Name), v.Line, file.File.Feed)
	}
	return explainTurns(line, r, e.flag)
}

// explainWindow says what the verdict was made of; restated: a newer version of the observation is held.
func explainWindow(line func(name, format string, args ...any), row *watcher.Row, restated bool, decided *rules.Act) {
	if row.N > 0 {
		line("made of", "%s from %s to %s", rules.Counted(row.N, "observation"), day(row.WindowFrom), day(row.WindowTo))
		line("mean, deviation", "%s, %s", percentNum(row.Mean), width(row.Deviation))
	}
	if row.Z.OK {
		line("z", "%+.3f, %s (tail %.3g)", row.Z.V, onceIn(row.Tail), row.Tail.V)
	}
	clipped := 0
	for _, u := range row.Window {
		if u.Return != u.Used {
			clipped++
		}
	}
	if clipped > 0 {
		line("clipped", "%s of the window held to the line that they broke", rules.Counted(clipped, "value"))
	}
	if takes := takesWords(row, restated, decided); takes != "" && !row.Apart() {
		line("window takes", "%s", takes)
	}
}
