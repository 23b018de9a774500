package main

import (
	"errors"
	"fmt"
	"os"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

func (a *app) ledgerCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "ledger",
		Short: "Verify, back up, restore, compact or export the store",
		Args:  cobra.NoArgs,
		RunE:  func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	cmd.AddCommand(a.verifyCommand(), a.backupCommand(), a.restoreCommand(), a.compactCommand(), a.exportCommand())
	return cmd
}

func (a *app) verifyCommand() *cobra.Command {
	var head string
	cmd := &cobra.Command{
		Use:   "verify",
		Short: "Check the whole ledger against itself",
		Long: `Checks every checksum and index, walks the hash-chained record of settings and decisions, and recomputes every rolling state and
used value from the returns held. Exit code 4 and the first place that differs when something is wrong.
With --head, the hash that was noted before must occur in the record, so that a cut-off end shows.`,
		Example: "  strayd ledger verify\n  strayd ledger verify --head 5f0c...",
		Args:    takes(0, 0),
		RunE:    func(*cobra.Command, []string) error { return a.verify(head) },
	}
	cmd.Flags().StringVar(&head, "head", "", "`HASH` of the record that was noted before")
	return beside(cmd)
}

func (a *app) verify(head string) error {
	return a.withLedger(ledger.ReadOnly, func(_ *config.Config, l *ledger.Ledger) error {
		bars := newBars(a.err)
		r, err := l.Verify(a.ctx, ledger.VerifyOptions{
			Head:     head,
			Progress: func(done, total int64) { bars.progress("verifying", done, total) },
			Recheck: func(v watcher.View) error {
				return watcher.Recheck(v, func(done, total int64) { bars.progress("recomputing", done, total) })
			},
		})
		bars.clear()
		if err != nil {
			return err
		}
		fmt.Fprintf(a.out, "The ledger is whole up to step %d: %s, %s checked, %s in the record of settings and decisions.\n", r.Step,
			rules.Counted(int(r.Names), "series"), rules.Counted(int(r.Values), "stored piece"), rules.Counted(int(r.Records), "entry"))
		if r.Head != "" {
			fmt.Fprintf(a.out, "Head of the record: %s\n", r.Head)
		}
		if head != "" && r.HeadSeen < r.Records {
			fmt.Fprintf(a.out, "The hash given is that of entry %d of %d.\n", r.HeadSeen, r.Records)
		}
		return nil
	})
}

func (a *app) backupCommand() *cobra.Command {
	return beside(&cobra.Command{
		Use:     "backup FILE",
		Short:   "Copy the ledger, verified, to a new file",
		Example: "  strayd ledger backup /backup/ledger-2026-03-13.db",
		Args:    takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			if _, err := os.Lstat(a.path(args[0])); err == nil {
				return fmt.Errorf("%s is there already; a backup never replaces a file", args[0])
			}
			return a.withLedger(ledger.ReadOnly, func(_ *config.Config, l *ledger.Ledger) error {
				r, err := l.Backup(a.ctx, a.path(args[0]))
				if err == nil {
					fmt.Fprintf(a.out, "Backed up step %d to %s, verified.\n", r.Step, args[0])
				}
				return err
			})
		},
	})
}

func (a *app) restoreCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "restore FILE",
		Short: "Put a backup in the ledger's place",
		Long: `Verifies the backup, then puts a copy of it in the place of the configuration's ledger. What was there is kept beside it
under another name.`,
		Example: "  strayd ledger restore /backup/ledger-2026-03-13.db",
		Args:    takes(1, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			c, err := a.load()
			if err != nil {
				return err
			}
			if _, err := os.Stat(args[0]); errors.Is(err, os.ErrNotExist) {
				return fmt.Errorf("there is no backup %s: name a file that `strayd ledger backup` wrote", args[0])
			}
			kept, r, err := ledger.Restore(a.ctx, args[0], c.Ledger)
			if err != nil {
				return err
			}
			fmt.Fprintf(a.out, "Restored step %d from %s.\n", r.Step, args[0])
			if kept != "" {
				fmt.Fprintf(a.out, "The ledger that was there is kept as %s.\n", kept)
			}
			return nil
		},
	}
}

func (a *app) compactCommand() *cobra.Command {
	return &cobra.Command{
		Use:     "compact",
		Short:   "Give freed space back to the disk",
		Example: "  strayd ledger compact",
		Args:    takes(0, 0),
		RunE: func(*cobra.Command, []string) error {
			c, err := a.load()
			if err != nil {
				return err
			}
			done, err := ledger.Compact(a.ctx, c.Ledger, ledger.Options{})
			if err != nil {
				return err
			}
			fmt.Fprintf(a.out, "%s: %s bytes before, %s after.\n", c.Ledger, rules.Thousands(int(done.Before)), rules.Thousands(int(done.After)))
			return nil
		},
	}
}
