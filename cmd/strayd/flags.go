package main

import (
	"fmt"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
)

const flagColumns = "ref,raised_at,date,series,group,kind,range,return,low,high,z,tail,reference,reference_return,residual," +
	"looks_like,share,implied,standing,reason,feed,file,line,note"

// flagFilter is which flags are asked for.
type flagFilter struct {
	all                        bool
	date, from, to             string
	kind, group, series, stand string
	feed, blocking, format     string

	on, since, until rules.Date
	today            rules.Date
}

func (a *app) flagsCommand() *cobra.Command {
	f := &flagFilter{}
	cmd := &cobra.Command{
		Use:   "flags",
		Short: "The flags that still ask something of a person",
		Long: `Lists the flags whose standing is open, acknowledged or reopened, and in groups with four_eyes those that wait for the second
person; --all lists every one. With --blocking GROUP, exit code 1 while a flag of that group holds its release back.

` + caution,
		Example: "  strayd flags\n  strayd flags --all --kind breach --from 2026-03-01 --format csv\n  strayd flags --blocking equity",
		Args:    takes(0, 0),
		RunE:    func(*cobra.Command, []string) error { return a.flags(f) },
	}
	s := cmd.Flags()
	s.BoolVar(&f.all, "all", false, "every flag, whatever its standing")
	s.StringVar(&f.date, "date", "", "of this valuation `DATE`")
	s.StringVar(&f.from, "from", "", "of this valuation `DATE` or later")
	s.StringVar(&f.to, "to", "", "of this valuation `DATE` or earlier")
	s.StringVar(&f.kind, "kind", "", "of this `KIND`: breach, limit, restated, refused, ...")
	s.StringVar(&f.group, "group", "", "of this `GROUP`")
	s.StringVar(&f.series, "series", "", "of this `SERIES`")
	s.StringVar(&f.stand, "standing", "", "of this `STANDING`: open, decided, history, ...")
	s.StringVar(&f.feed, "feed", "", "of this `FEED`")
	s.StringVar(&f.blocking, "blocking", "", "of this `GROUP`, exit code 1 when there is one")
	s.StringVar(&f.format, "format", "table", "`FORMAT`: table, csv or json")
	return beside(cmd)
}

func (f *flagFilter) check() (err error) {
	if err := checkFormat(f.format); err != nil {
		return err
	}
	if f.kind != "" && !slices.Contains(rules.Kinds, rules.Kind(f.kind)) {
		return usagef("--kind %q: need one of %s", f.kind, joinWords(rules.Kinds))
	}
	if f.stand != "" && !slices.Contains(rules.Standings, rules.Standing(f.stand)) {
		return usagef("--standing %q: need one of %s", f.stand, joinWords(rules.Standings))
	}
	for _, d := range []struct {
		name, text string
		into       *rules.Date
	}{{"--date", f.date, &f.on}, {"--from", f.from, &f.since}, {"--to", f.to, &f.until}} {
		if *d.into = rules.NoDate; d.text != "" {
			if *d.into, err = rules.ParseDate(d.text); err != nil {
				return usagef("%s: %w", d.name, err)
			}
		}
	}
	return nil
}

func joinWords[T ~string](words []T) string {
	texts := make([]string, len(words))
	for i, w := range words {
		texts[i] = string(w)
	}
	return strings.Join(texts, ", ")
}

// checkGroups refuses a group that nobody has declared, so that a mistyped name never looks like a release that nothing holds back.
func (f *flagFilter) checkGroups(c *config.Config) error {
	s, _, err := settings(c)
	if err != nil {
		return err
	}
	known := map[string]bool{"": true}
	for _, g := range s.Groups {
		known[g.Name] = true
	}
	for _, group := range s.Assigned {
		known[group] = true
	}
	for _, option := range [][2]string{{"--group", f.group}, {"--blocking", f.blocking}} {
		if !known[option[1]] {
			return usagef("%s %q: neither %s nor its register of series has this group", option[0], option[1], c.File)
		}
	}
	return nil
}

// narrow says that other flags than those listed may ask something.
func (f *flagFilter) narrow() bool {
	return f.all || f.date+f.from+f.to+f.kind+f.group+f.series+f.stand+f.feed+f.blocking != ""
}

// head says whether a flag may be asked for, as far as its head tells.
func (f *flagFilter) head(h watcher.FlagHead) bool {
	return (f.kind == "" || f.kind == string(h.Kind)) && (f.on == rules.NoDate || h.Date == f.on) &&
		h.Date >= f.since && (f.until == rules.NoDate || h.Date <= f.until)
}

// takes says whether a flag is asked for. Its standing becomes that of today, when a waiver may have run out.
func (f *flagFilter) takes(g *rules.Flag) bool {
	asks := g.AsksOn(f.today)
	g.Standing = g.StandingOn(f.today)
	if !f.all && f.stand == "" && !asks {
		return false
	}
	is := func(want, have string) bool { return want == "" || want == have }
	return is(f.group, g.Group) && is(f.blocking, g.Group) && is(f.series, g.Series) &&
		is(f.stand, string(g.Standing)) && is(f.feed, g.Feed)
}

func (a *app) flags(f *flagFilter) error {
	if err := f.check(); err != nil {
		return err
	}
	all := f.all || f.stand != "" && !rules.Standing(f.stand).Asks()
	blocked := false
	err := a.reading(func(c *config.Config, v watcher.View) (err error) {
		if err := f.checkGroups(c); err != nil {
			return err
		}
		if f.today, err = a.today(c); err != nil {
			return err
		}
		if f.format == "table" {
			return a.flagTable(v, all, f, &blocked)
		}
		l, err := newListing(a.out, f.format, flagColumns)
		if err != nil {
			return err
		}
		var rowErr error
		err = v.FlagsOf(all, f.head, func(g rules.Flag) bool {
			if f.takes(&g) {
				blocked = blocked || g.AsksOn(f.today) && !g.Kind.Slow()
				rowErr = l.row(flagCells(&g)...)
			}
			return rowErr == nil
		})
		return firstError(err, rowErr, l.end())
	})
	if err == nil && f.blocking != "" && blocked {
		return quiet{exitFailed}
	}
	return err
}

func firstError(errs ...error) error {
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// flagCells are the columns of a flag. The ref is a name, so it is text in JSON too.
func flagCells(g *rules.Flag) []cell {
	line := null
	if g.Line > 0 {
		line = integer(g.Line)
	}
	return []cell{text(fmt.Sprint(g.Ref)), moment(g.RaisedAt), date(g.Date), text(g.Series), text(g.Group), text(string(g.Kind)), text(g.Range),
		units(g.Return), number(g.Low), number(g.High), number(g.Z), number(g.Tail), text(g.Reference), number(g.ReferenceReturn),
		number(g.Residual), text(string(g.LooksLike)), number(g.Share), number(g.Implied), text(string(g.Standing)), text(string(reasonOf(g))),
		text(g.Feed), text(g.File), line, text(noteOf(g))}
}

// reasonOf is the reason that was given last.
func reasonOf(g *rules.Flag) rules.Reason {
	for _, a := range []*rules.Act{g.Last, g.Decided} {
		if a != nil && a.Reason != "" {
			return a.Reason
		}
	}
	return ""
}

// noteOf is what the flag says, then what people said of it.
func noteOf(g *rules.Flag) string {
	notes := []string{g.Note}
	if g.Decided != nil {
		notes = append(notes, g.Decided.Note)
	}
	if g.Last != nil && g.Last != g.Decided {
		notes = append(notes, g.Last.Note)
	}
	return strings.Join(slices.DeleteFunc(notes, func(s string) bool { return s == "" }), "; ")
}

// flagTable prints flags as the desk reads them, newest date last, and says how many there are. blocked becomes true when one of
// them asks something of a person.
func (a *app) flagTable(v watcher.View, all bool, f *flagFilter, blocked *bool) error {
	w, n := columns(a.out), 0
	err := v.FlagsOf(all, f.head, func(g rules.Flag) bool {
		if !f.takes(&g) {
			return true
		}
		*blocked = *blocked || g.AsksOn(f.today)
		if n++; n == 1 {
			fields(w, "ref", "date", "series", "kind", "return", "expected", "z", "how rare", "standing", "note")
		}
		fields(w, flagFields(&g)...)
		return true
	})
	if err := firstError(err, w.Flush()); err != nil {
		return err
	}
	if n == 0 {
		if f.narrow() {
			fmt.Fprintln(a.out, "No flag fits.")
		} else {
			fmt.Fprintln(a.out, "No flag asks anything of anyone.")
		}
		return nil
	}
	fmt.Fprintf(a.out, "\n%s. `strayd explain REF` shows every figure behind one.\n%s\n", rules.Counted(n, "flag"), caution)
	return nil
}

func flagFields(g *rules.Flag) []string {
	value, z, rare := "-", "-", "-"
	if g.Return != rules.Missing {
		value = rules.InPercent(g.Return.Float())
	}
	if g.Z.OK {
		z, rare = fmt.Sprintf("%+.1f", g.Z.V), onceIn(g.Tail)
	}
	return []string{fmt.Sprint(g.Ref), day(g.Date), printable(flagSubject(g)), string(g.Kind), value, between(g.Low, g.High), z, rare, string(g.Standing), printable(noteOf(g))}
}
