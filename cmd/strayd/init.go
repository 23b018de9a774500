package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"strayd/rules"
	"strayd/watcher/ledger"
)

func (a *app) initCommand() *cobra.Command {
	var replace bool
	cmd := &cobra.Command{
		Use:   "init [FILE...]",
		Short: "Write a configuration from sample files, and make the ledger",
		Long: `With sample files, looks at each (layout, names of columns, separator, decimal mark, order of the date, unit, missing tokens, encoding)
and writes a commented configuration: what it saw, how sure that is, and with the word CONFIRM what the samples cannot prove and a person
must look at. Files of one folder with the same header become one feed. The configuration reads the samples as they are: ` + "`strayd check`" + `
shows how, ` + "`strayd pass`" + ` loads them. A configuration that is there is left alone, unless --replace says otherwise.

Then, or without files, makes an empty ledger where the configuration says. Only init and demo make one, so that a mistyped path never
looks like a new ledger. A ledger that is there is left as it is.`,
		Example: "  strayd init inbox/returns-2026-03-*.csv\n  strayd --config desk.yaml init inbox/*.csv indices/*.csv\n" +
			"  strayd init                          only the ledger",
		Args: cobra.ArbitraryArgs,
		RunE: func(_ *cobra.Command, files []string) error {
			switch {
			case len(files) > 0:
				return a.initFrom(files, replace)
			case replace:
				return usagef("--replace goes with sample files")
			}
			return a.init()
		},
	}
	cmd.Flags().BoolVar(&replace, "replace", false, "write over the configuration that is there")
	return cmd
}

func (a *app) init() error {
	made, err := a.makeLedger()
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "Made the ledger %s. Next: `strayd check`, then `strayd pass`.\n", made)
	return nil
}

// makeLedger makes the configuration's ledger and gives its path.
func (a *app) makeLedger() (string, error) {
	c, err := a.load()
	if err != nil {
		return "", err
	}
	l, err := openLedger(c, ledger.Create)
	if err != nil {
		return c.Ledger, err
	}
	if err := l.Close(); err != nil {
		return c.Ledger, err
	}
	if os.Getuid() == 0 {
		fmt.Fprintln(a.err, "note: made as root, so that only root may read it")
	}
	return c.Ledger, nil
}

// initFrom writes a configuration that reads the samples, then makes its ledger.
func (a *app) initFrom(files []string, replace bool) error {
	if _, err := os.Lstat(a.configPath); err == nil && !replace {
		return fmt.Errorf("%s is there already and is left as it is; --replace writes over it, --config names another", a.configPath)
	}
	now, err := a.now()
	if err != nil {
		return err
	}
	drafts, err := a.draftFeeds(files, now)
	if err != nil {
		return err
	}
	folder, err := filepath.Abs(filepath.Dir(a.configPath))
	if err != nil {
		return err
	}
	text := configText(drafts, folder, now)
	if err := a.tryDrafts(drafts, text, now); err != nil {
		return err
	}
	if err := writeNew(a.configPath, text, replace); err != nil {
		return err
	}
	a.sayDrafts(drafts)
	made, err := a.makeLedger()
	switch {
	case errors.Is(err, ledger.ErrExists):
		fmt.Fprintf(a.out, "Wrote %s. The ledger %s is there already and is left as it is.\n", a.configPath, made)
	case err != nil:
		return err
	default:
		fmt.Fprintf(a.out, "Wrote %s and made the ledger %s.\n", a.configPath, made)
	}
	a.sayNext(strings.Count(text, confirmMark) - 1) // the first is about them
	return nil
}

func (a *app) sayNext(marks int) {
	fmt.Fprintf(a.out, "%s stands at %s in it: look at each before flags are relied on.\n", confirmMark, rules.Counted(marks, "line"))
	option := ""
	if a.configPath != defaultConfig {
		option = "--config " + a.configPath + " "
	}
	fmt.Fprintf(a.out, "Next: `strayd %scheck --settled` shows the first rows as understood, `strayd %spass --settled` loads them.\n", option, option)
}

// writeNew writes a file that is not there yet, or with replace puts it in the place of the one that is.
func writeNew(path, text string, replace bool) error {
	how := os.O_WRONLY | os.O_CREATE | os.O_EXCL
	if replace {
		how = os.O_WRONLY | os.O_CREATE | os.O_TRUNC
	}
	f, err := os.OpenFile(path, how, 0o644)
	if err != nil {
		return err
	}
	_, err = f.WriteString(text)
	return errors.Join(err, f.Close())
}
