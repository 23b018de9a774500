package main

import (
	"fmt"
	"os"

	"github.com/spf13/cobra"

	"strayd/watcher/ledger"
)

func (a *app) initCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "init",
		Short: "Make the ledger that the configuration names",
		Long: `Makes an empty ledger where the configuration says. Only init and demo make one, so that a mistyped path never looks
like a new ledger. An existing file is left as it is.`,
		Example: "  strayd init\n  strayd --config desk.yaml init",
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) > 0 {
				return fmt.Errorf("init takes no files in this version: writing a configuration from samples comes later; `strayd check --example` prints one to begin with")
			}
			return nil
		},
		RunE: func(*cobra.Command, []string) error { return a.init() },
	}
}

func (a *app) init() error {
	c, err := a.load()
	if err != nil {
		return err
	}
	a.sayLater(c)
	l, err := openLedger(c, ledger.Create)
	if err != nil {
		return err
	}
	if err := l.Close(); err != nil {
		return err
	}
	if os.Getuid() == 0 {
		fmt.Fprintln(a.err, "note: made as root, so that only root may read it")
	}
	fmt.Fprintf(a.out, "Made the ledger %s. Next: `strayd check`, then `strayd pass`.\n", c.Ledger)
	return nil
}
