package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

const rangeColumns = "series,range,n,mean,deviation,watch_low,watch_high,low,high,why"

func (a *app) rangesCommand() *cobra.Command {
	var format string
	cmd := &cobra.Command{
		Use:   "ranges [SERIES]",
		Short: "What would be in range next",
		Long: `For each series and range: the lines that a return of today (or of --now) would be judged by, were it the next one.
low and high are the breach line's.`,
		Example: "  strayd ranges\n  strayd ranges alder-income --format json",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			if err := checkFormat(format); err != nil {
				return err
			}
			only := ""
			if len(args) == 1 {
				only = args[0]
			}
			return a.ranges(only, format)
		},
	}
	cmd.Flags().StringVar(&format, "format", "table", "`FORMAT`: table, csv or json")
	return beside(cmd)
}

func (a *app) ranges(only, format string) error {
	return a.withLedger(ledger.ReadOnly, func(c *config.Config, l *ledger.Ledger) error { return a.rangesOf(c, l, only, format) })
}

func (a *app) rangesOf(c *config.Config, l watcher.Store, only, format string) error {
	p, err := a.newPass(c, l)
	if err != nil {
		return err
	}
	if only != "" {
		if err := knownSeries(l, only); err != nil {
			return err
		}
	}
	row, end, err := a.rangeWriter(format)
	if err != nil {
		return err
	}
	return firstError(p.Expect(only, rules.DateFrom(p.Now.In(c.Location)), row), end())
}

// knownSeries is an error when the ledger has no such series.
func knownSeries(l watcher.Store, series string) error {
	v, err := l.View()
	if err != nil {
		return err
	}
	defer v.Close() //nolint:errcheck // only read
	names, err := v.Names()
	if err != nil {
		return err
	}
	if _, ok := names.Find([]byte(series)); !ok {
		return notFound(&watcher.UnknownSeries{Series: series})
	}
	return nil
}

// rangeWriter gives what writes one row, and what ends the list, in the format asked for.
func (a *app) rangeWriter(format string) (row func(watcher.Expected) error, end func() error, err error) {
	if format != "table" {
		l, err := newListing(a.out, format, rangeColumns)
		return func(e watcher.Expected) error { return l.row(rangeCells(&e)...) }, l.end, err
	}
	w := columns(a.out)
	fields(w, "series", "range", "n", "mean", "deviation", "watched beyond", "expected", "why")
	return func(e watcher.Expected) error {
		n := "-"
		if e.N > 0 {
			n = fmt.Sprint(e.N)
		}
		fields(w, printable(e.Series), e.Range, n, percentNum(e.Mean), width(e.Deviation), between(e.WatchLow, e.WatchHigh), between(e.Low, e.High), e.Why)
		return nil
	}, w.Flush, nil
}

func rangeCells(e *watcher.Expected) []cell {
	n := null
	if !e.Limited {
		n = integer(e.N)
	}
	return []cell{text(e.Series), text(e.Range), n, number(e.Mean), number(e.Deviation), number(e.WatchLow), number(e.WatchHigh), number(e.Low),
		number(e.High), text(e.Why)}
}
