package main

import (
	"bufio"
	"errors"
	"os"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
	"strayd/watcher/parquet"
)

func (a *app) exportCommand() *cobra.Command {
	var format, what string
	cmd := &cobra.Command{
		Use:   "export",
		Short: "Write every return held, as CSV or Parquet",
		Long: `Writes the newest value of every observation, by date, then series: date,series,return,days,status, the return as an
exact fraction, with the business days that it covers, and estimate where it is one.
With --what prices, the prices of price feeds instead: date,series,price.

As Parquet: date is DATE, series STRING, return DECIMAL(38,15), price DECIMAL(38,10), days INT32, status STRING or null. Any engine that
reads Parquet can take over from there, and a feed of strayd can too.`,
		Example: "  strayd ledger export > returns.csv\n  strayd ledger export --format parquet > returns.parquet\n  strayd ledger export --what prices > prices.csv",
		Args:    takes(0, 0),
		RunE:    func(*cobra.Command, []string) error { return a.export(what, format) },
	}
	cmd.Flags().StringVar(&format, "format", "csv", "`FORMAT`: csv or parquet")
	cmd.Flags().StringVar(&what, "what", "returns", "`WHAT`: returns or prices")
	return beside(cmd)
}

func (a *app) export(what, format string) error {
	w := watcher.Returns
	switch what {
	case "returns":
	case "prices":
		w = watcher.Prices
	default:
		return usagef("--what %q: need returns or prices", what)
	}
	switch out, ok := a.out.(*os.File); {
	case format != "csv" && format != "parquet":
		return usagef("--format %q: need csv or parquet", format)
	case format == "parquet" && ok && term.IsTerminal(int(out.Fd())):
		return usagef("a Parquet file is not for a terminal: write it to a file, as in `strayd ledger export --format parquet > returns.parquet`")
	}
	return a.withLedger(ledger.ReadOnly, func(_ *config.Config, l *ledger.Ledger) error {
		v, err := l.Read()
		if err != nil {
			return err
		}
		defer v.Close() //nolint:errcheck // only read
		if format == "parquet" {
			return a.exportParquet(v, w)
		}
		return a.exportOf(v, w)
	})
}

// eachHeld calls do with every value held, with its terms.
func eachHeld(v *ledger.View, w watcher.What, do func(d rules.Date, series []byte, value int64, t rules.Terms) error) error {
	names, err := v.Names()
	if err != nil {
		return err
	}
	terms, err := watcher.NewTermsReader(v)
	if err != nil {
		return err
	}
	return v.Values(w, func(d rules.Date, series uint32, value int64) error {
		var t rules.Terms
		if w == watcher.Returns {
			if t, err = terms.At(d, series); err != nil {
				return err
			}
		}
		return do(d, names.Name(series), value, t)
	})
}

func (a *app) exportOf(v *ledger.View, w watcher.What) error {
	columns := "date,series,return,days,status"
	if w == watcher.Prices {
		columns = "date,series,price"
	}
	l, err := newListing(a.out, "csv", columns)
	if err != nil {
		return err
	}
	err = eachHeld(v, w, func(d rules.Date, series []byte, value int64, t rules.Terms) error {
		s := rules.Decimal(value, w.Places())
		row := []cell{date(d), text(string(series)), {s, s}}
		if w == watcher.Returns {
			row = append(row, termsCells(t)...)
		}
		return l.row(row...)
	})
	return firstError(err, l.end())
}

func (a *app) exportParquet(v *ledger.View, w watcher.What) error {
	out := bufio.NewWriterSize(a.out, 1<<16)
	table := parquet.NewWriter(out, w)
	if err := eachHeld(v, w, table.Write); err != nil {
		return err // without its end the table is no file that anything takes
	}
	return errors.Join(table.Close(), out.Flush())
}

// termsCells are the days that a value covers, and its status where it is an estimate.
func termsCells(t rules.Terms) []cell {
	status := ""
	if t.Estimate {
		status = "estimate"
	}
	return []cell{integer(t.Span()), text(status)}
}
