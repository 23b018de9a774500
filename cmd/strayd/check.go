package main

import (
	"errors"
	"fmt"
	"io"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/feed"
	"strayd/watcher/ledger"
	"strayd/watcher/schedule"
)

// checking is what check is asked for.
type checking struct{ settled, schema, example, send bool }

func (a *app) checkCommand() *cobra.Command {
	var asked checking
	cmd := &cobra.Command{
		Use:   "check",
		Short: "Check the configuration and the feeds, and say what each line means",
		Long: `Checks the configuration, reads what lies in the feeds without storing any of it, and says each line in every form,
with the flags to expect of it. Asks the chat service, where there is a token for it, whether notices would arrive; with --send a test
notice tells. Exit code 78 when the configuration is wrong, 1 when a file would be refused or a test did not arrive.`,
		Example: "  strayd check\n  strayd check --send\n  strayd check --example > strayd.yaml      a configuration to begin with\n" +
			"  strayd check --schema > strayd.schema.json",
		Args: takes(0, 0),
		RunE: func(*cobra.Command, []string) error {
			switch {
			case asked.schema:
				_, err := a.out.Write(config.Schema())
				return err
			case asked.example:
				_, err := io.WriteString(a.out, config.Starter)
				return err
			}
			return a.check(asked)
		},
	}
	cmd.Flags().BoolVar(&asked.settled, "settled", false, "take my word that every file is whole")
	cmd.Flags().BoolVar(&asked.send, "send", false, "post a test notice to every channel")
	cmd.Flags().BoolVar(&asked.schema, "schema", false, "print the JSON Schema of the configuration, and nothing else")
	cmd.Flags().BoolVar(&asked.example, "example", false, "print a commented configuration to begin with, and nothing else")
	return cmd
}

func (a *app) check(asked checking) error {
	c, err := a.load()
	if err != nil {
		return err
	}
	a.sayLater(c)
	fmt.Fprintf(a.out, "%s is right.\n\n", c.File)
	series, refused, err := a.checkFeeds(c, asked.settled)
	if err != nil {
		return err
	}
	if n, err := heldSeries(c); err != nil {
		fmt.Fprintf(a.out, "ledger: %v\n", err)
	} else {
		series = max(series, n)
		fmt.Fprintf(a.out, "ledger: %s, %s held\n", c.Ledger, rules.Counted(n, "series"))
	}
	refused += a.checkChannels(c, asked.send)
	if err := a.sayLines(c, series); err != nil {
		return err
	}
	if refused > 0 {
		return quiet{exitFailed}
	}
	return nil
}

func heldSeries(c *config.Config) (int, error) {
	l, err := openLedger(c, ledger.ReadOnly)
	if err != nil {
		return 0, err
	}
	v, err := l.View()
	if err != nil {
		return 0, errors.Join(err, l.Close())
	}
	names, err := v.Names()
	if err = errors.Join(err, v.Close(), l.Close()); err != nil {
		return 0, err
	}
	return names.Len(), nil
}

// checkFeeds reads every ready file (with settled, every file) without storing it.
func (a *app) checkFeeds(c *config.Config, settled bool) (series, refused int, err error) {
	now, err := a.now()
	if err != nil {
		return 0, 0, err
	}
	names := watcher.NewNames(nil, nil)
	for _, f := range c.Feeds {
		fmt.Fprintf(a.out, "feed %s: %s/%s\n", f.Name, f.Dir, f.Pattern)
		if f.Schedule != "" {
			a.sayRuns(c, f.Schedule, now)
		}
		found, err := source{}.Find(f, now, settled)
		if err != nil {
			fmt.Fprintf(a.out, "  cannot be looked into: %v\n", err)
			refused++
			continue
		}
		for _, w := range found.Waiting {
			fmt.Fprintf(a.out, "  %s waits: %s\n", printable(w.Name), w.Why)
		}
		for _, bad := range found.Refused {
			fmt.Fprintf(a.out, "  would be refused: %s\n", printable(bad.Error()))
			refused++
		}
		for _, file := range found.Ready {
			sheet, err := feed.Read(a.ctx, file, f, names, feed.Options{Now: now})
			if err != nil {
				fmt.Fprintf(a.out, "  would be refused: %s\n", printable(err.Error()))
				refused++
				continue
			}
			saySheet(a.out, sheet)
		}
	}
	return names.Len(), refused, nil
}

// sayRuns lists the next runs of a feed's schedule.
func (a *app) sayRuns(c *config.Config, spec string, now time.Time) {
	s, err := schedule.Parse(spec, c.Location)
	if err != nil {
		return // the configuration's own check has said so
	}
	fmt.Fprint(a.out, "  next runs of a daemon:")
	for _, t := range s.Upcoming(now, 3) {
		fmt.Fprint(a.out, " "+t.In(c.Location).Format("Mon 2006-01-02 15:04 MST")+";")
	}
	fmt.Fprintln(a.out)
	if w := s.Warning(); w != "" {
		fmt.Fprintln(a.out, "  "+w)
	}
}

func saySheet(w io.Writer, s *watcher.Sheet) {
	fmt.Fprintf(w, "  %s: %s from %s to %s\n", printable(s.File.Name), rules.Counted(s.Rows, "row"), s.First(), s.Last())
	for _, note := range s.Notes {
		fmt.Fprintf(w, "    %s\n", printable(note))
	}
	if len(s.Columns) == 0 {
		return
	}
	col := s.Columns[0]
	vals := make([]int64, min(col.Len(), 64))
	col.Fill(vals, 0, s.What.Places())
	for i, v := range vals {
		if v != watcher.Missing64 {
			value := rules.InPercent(rules.Units(v).Float())
			if s.What == watcher.Prices {
				value = "a price of " + rules.Price(v).String()
			}
			name := s.Names.Name(col.Block*watcher.BlockSize + uint32(i))
			fmt.Fprintf(w, "    line %d is understood as %s of %s on %s\n", col.Line(i), value, printable(string(name)), day(col.Date))
			return
		}
	}
}

// sayLines says each line of each range in every form.
func (a *app) sayLines(c *config.Config, series int) error {
	s, _, err := settings(c)
	if err != nil {
		return err
	}
	watcher.ResolveBudgets(&s, max(series, 1))
	for _, r := range s.Ranges {
		g, err := rules.NewGauge(r)
		if err != nil {
			return err
		}
		fmt.Fprintf(a.out, "\nrange %s: ", r.Name)
		if r.Limit != nil {
			fmt.Fprintf(a.out, "limit %s\n", between(rules.Some(r.Limit.Low.Float()), rules.Some(r.Limit.High.Float())))
			continue
		}
		fmt.Fprintf(a.out, "window %d, scale %s, tail %s\n", r.Window, r.Scale, tailWords(r.Tail))
		w := columns(a.out)
		for _, l := range []struct {
			name string
			line rules.Line
		}{{"watch", r.Watch}, {"breach", r.Breach}} {
			f, ok := g.Forms(l.line)
			if !ok || l.line.Budget > 0 && series == 0 {
				fields(w, "  "+l.name, "a budget, turned into a level once there are series")
				continue
			}
			expect := ""
			if series > 0 {
				perWeek := 5 * f.Tail * float64(series)
				expect = fmt.Sprintf("about %.3g a week for %d series", perWeek, series)
			}
			z := "-"
			if f.Z > 0 {
				z = fmt.Sprintf("%.4g", f.Z)
			}
			fields(w, "  "+l.name, fmt.Sprintf("tail %.4g %%", 100*f.Tail), fmt.Sprintf("confidence %.6g %%", 100*f.Confidence), "z "+z,
				fmt.Sprintf("once in %.4g days", f.Days), expect)
		}
		if err := w.Flush(); err != nil {
			return err
		}
	}
	fmt.Fprintf(a.out, "\nExpected counts hold if returns follow the tail chosen; series move together, so that flags cluster.\n")
	return nil
}

func tailWords(t rules.TailModel) string {
	switch {
	case t.Name == "t":
		return fmt.Sprintf("t with %g degrees of freedom", t.DF)
	case t.Name == "auto":
		return "auto (t with 5 degrees of freedom in this version)"
	}
	return t.Name
}
