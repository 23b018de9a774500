package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
)

const historyColumns = "series,date,return,range,window_from,window_to,n,mean,deviation,z,tail,log10_tail,low,high,verdict,why,used"

func (a *app) historyCommand() *cobra.Command {
	var format, from, to string
	cmd := &cobra.Command{
		Use:   "history SERIES",
		Short: "Each observation with its window, range and verdict",
		Long: `Recomputes every verdict from the returns held: one row an observation and range, by date, then in the order of
the configuration. Returns are fractions in CSV and JSON; low and high are the breach line's.`,
		Example: "  strayd history alder-income\n  strayd history alder-income --from 2026-01-01 --format csv",
		Args:    takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			return a.history(args[0], from, to, format)
		},
	}
	cmd.Flags().StringVar(&from, "from", "", "first valuation `DATE`")
	cmd.Flags().StringVar(&to, "to", "", "last valuation `DATE`")
	cmd.Flags().StringVar(&format, "format", "table", "`FORMAT`: table, csv or json")
	return beside(cmd)
}

func (a *app) history(series, from, to, format string) error {
	since, until := rules.NoDate, rules.NoDate
	var err error
	if from != "" {
		if since, err = rules.ParseDate(from); err != nil {
			return usagef("--from: %w", err)
		}
	}
	if to != "" {
		if until, err = rules.ParseDate(to); err != nil {
			return usagef("--to: %w", err)
		}
	}
	if from != "" && to != "" && since > until {
		return usagef("--from %s is later than --to %s", since, until)
	}
	if err := checkFormat(format); err != nil {
		return err
	}
	return a.reading(func(c *config.Config, v watcher.View) error {
		r, err := watcher.NewReader(v)
		if err != nil {
			return err
		}
		rows, err := r.History(series, since, until)
		if err != nil {
			return notFound(err)
		}
		if format == "table" {
			return a.historyTable(rows)
		}
		l, err := newListing(a.out, format, historyColumns)
		if err != nil {
			return err
		}
		for i := range rows {
			if err := l.row(historyCells(&rows[i])...); err != nil {
				return err
			}
		}
		return l.end()
	})
}

func historyCells(r *watcher.Row) []cell {
	n := null
	if !r.Limited {
		n = integer(r.N)
	}
	return []cell{text(r.Series), date(r.Date), units(r.Return), text(r.Range), date(r.WindowFrom), date(r.WindowTo), n, number(r.Mean),
		number(r.Deviation), number(r.Z), number(r.Tail), number(r.Log10), number(r.Low), number(r.High), text(string(r.Finding)), text(r.Why), units(r.Used)}
}

func (a *app) historyTable(rows []watcher.Row) error {
	w := columns(a.out)
	fields(w, "date", "return", "range", "expected", "z", "how rare", "verdict", "used", "why")
	for i := range rows {
		r := &rows[i]
		z, used := "-", "-"
		if r.Z.OK {
			z = fmt.Sprintf("%+.2f", r.Z.V)
		}
		switch {
		case r.Apart():
		case r.Used == rules.Missing:
			used = "left out"
		case r.Used != r.Judged():
			used = rules.InPercent(r.Used.Float())
		default:
			used = "in full"
		}
		fields(w, day(r.Date), rules.InPercent(r.Return.Float()), r.Range, between(r.Low, r.High), z, onceIn(r.Tail), string(r.Finding), used, printable(r.Why))
	}
	return w.Flush()
}
