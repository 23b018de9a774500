package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

func (a *app) demoCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "demo [FOLDER]",
		Short: "A small invented book, judged from start to end",
		Long: `Writes an invented book of 24 funds into a fresh folder: a configuration, a year of history, and a week of daily files with
errors planted in them. Then it makes the ledger and runs one pass a day, printing what strayed. Everything stays in the folder,
to be tried with the other commands.`,
		Example: "  strayd demo\n  strayd demo /tmp/book",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			folder := "strayd-demo"
			if len(args) == 1 {
				folder = args[0]
			}
			return a.demo(folder)
		},
	}
}

func (a *app) demo(folder string) error {
	if _, err := os.Lstat(folder); err == nil {
		return fmt.Errorf("%s is there already; remove it, or name another folder: strayd demo FOLDER", folder)
	}
	if err := os.MkdirAll(filepath.Join(folder, "inbox"), 0o755); err != nil {
		return err
	}
	a.configPath = filepath.Join(folder, "strayd.yaml")
	if err := os.WriteFile(a.configPath, []byte(demoConfig), 0o644); err != nil {
		return err
	}
	if err := os.WriteFile(filepath.Join(folder, "series.csv"), []byte(demoRegister()), 0o644); err != nil {
		return err
	}
	c, err := a.load()
	if err != nil {
		return err
	}
	l, err := openLedger(c, ledger.Create)
	if err != nil {
		return err
	}
	return errors.Join(a.demoWeek(c, l, folder), l.Close())
}

// demoWeek drops one file after the other into the inbox and runs a pass on each.
func (a *app) demoWeek(c *config.Config, l *ledger.Ledger, folder string) error {
	fmt.Fprintf(a.out, "An invented book in %s: 24 funds in 3 groups, a year of history, then one week, a file a day.\n", folder)
	for _, f := range newBook().files() {
		if err := os.WriteFile(filepath.Join(folder, "inbox", f.name), []byte(f.content), 0o644); err != nil {
			return err
		}
		a.nowText = f.at.Format(time.RFC3339)
		fmt.Fprintf(a.out, "\n%s  %s\n", f.at.Format("Mon 2 Jan 2006 15:04"), f.story)
		first, err := nextRef(l)
		if err != nil {
			return err
		}
		if err := a.passOver(c, l, "", true); err != nil && !isQuiet(err) {
			return err
		}
		if err := a.sayNew(l, first); err != nil {
			return err
		}
	}
	fmt.Fprintf(a.out, "\n%s\n\nLook further (from the source, write go run ./cmd/strayd for strayd):\n", caution)
	for _, next := range []string{"flags", "explain 11", "history birch-income --from 2026-03-09", "ranges --now 2026-03-16", "ledger verify"} {
		fmt.Fprintf(a.out, "  strayd --config %s %s\n", filepath.Join(folder, "strayd.yaml"), next)
	}
	return nil
}

func isQuiet(err error) bool {
	var q quiet
	return errors.As(err, &q)
}

func nextRef(l watcher.Store) (uint64, error) {
	v, err := l.View()
	if err != nil {
		return 0, err
	}
	return v.NextRef(), v.Close()
}

// sayNew prints the flags from a ref on that ask something of a person, each in two lines; the rest are counted.
func (a *app) sayNew(l watcher.Store, first uint64) error {
	v, err := l.View()
	if err != nil {
		return err
	}
	past := 0
	err = v.Flags(true, func(f rules.Flag) bool {
		switch {
		case f.Ref < first:
		case !f.Standing.Asks():
			past++
		default:
			a.sayFlag(&f)
		}
		return true
	})
	if past > 0 {
		fmt.Fprintf(a.out, "  %s of the first load stand as history and ask nothing of anyone.\n", plural(past, "flag"))
	}
	return errors.Join(err, v.Close())
}

// sayFlag is a flag in two lines, the first complete alone.
func (a *app) sayFlag(f *rules.Flag) {
	if f.Series == "" {
		fmt.Fprintf(a.out, "  Ref %d  %s: %s\n", f.Ref, f.Kind, printable(f.Note))
		return
	}
	fmt.Fprintf(a.out, "  Ref %d  %s: %s  %s  for %s\n", f.Ref, f.Kind, printable(f.Series), percent(f.Return.Float()), day(f.Date))
	detail := ""
	if f.Low.OK || f.High.OK {
		detail = "expected " + between(f.Low, f.High)
	}
	if f.Z.OK {
		detail += fmt.Sprintf("; z %+.1f, %s", f.Z.V, onceIn(f.Tail))
	}
	if f.Note != "" {
		if detail != "" {
			detail += "; "
		}
		detail += printable(f.Note)
	}
	fmt.Fprintf(a.out, "         %s\n", detail)
}
