package main

import (
	"context"
	"errors"
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// Exit codes, which other programs read.
const (
	exitDone    = 0
	exitFailed  = 1
	exitUsage   = 2
	exitHeld    = 3
	exitDamaged = 4
	exitConfig  = 78
)

// defaultConfig is the configuration that a command goes by when none is named.
const defaultConfig = "strayd.yaml"

// quiet is an error whose words have been printed already; only its exit code is left.
type quiet struct{ code int }

func (q quiet) Error() string { return fmt.Sprintf("exit %d", q.code) }

// usageError is a wrong call of a command that runs.
type usageError struct{ error }

func usagef(format string, args ...any) error { return usageError{fmt.Errorf(format, args...)} }

// run carries out one command line and gives its exit code. No stack trace reaches a person.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	return (&app{ctx: ctx, out: stdout, err: stderr}).execute(args)
}

func (a *app) execute(args []string) (code int) {
	defer func() {
		if r := recover(); r != nil {
			fmt.Fprintf(a.err, "strayd: internal error: %v\nThis is a fault of the program, not of your data. What was published before it stands; `strayd ledger verify` checks it.\n", r)
			code = exitFailed
		}
	}()
	a.args = args
	root := a.root()
	root.SetArgs(joinCorrection(args))
	root.SetOut(a.out)
	root.SetErr(a.err)
	err := root.ExecuteContext(a.ctx)
	if err == nil {
		return exitDone
	}
	code = a.codeOf(err)
	var q quiet
	if errors.As(err, &q) {
		return code
	}
	fmt.Fprintf(a.err, "strayd: %v\n", err)
	if code == exitUsage {
		fmt.Fprintln(a.err, "See `strayd help`, or `strayd COMMAND --help`.")
	}
	var damaged *ledger.Damaged
	if errors.As(err, &damaged) {
		fmt.Fprintln(a.err, "The way back from a damaged ledger: strayd ledger restore BACKUP")
	}
	return code
}

func (a *app) codeOf(err error) int {
	var q quiet
	var usage usageError
	var bad config.Errors
	var setting badSetting
	switch {
	case errors.As(err, &q):
		return q.code
	case errors.As(err, &usage), !a.started:
		return exitUsage
	case errors.As(err, &bad), errors.As(err, &setting):
		return exitConfig
	case errors.Is(err, ledger.ErrHeld):
		return exitHeld
	case unusable(err):
		return exitDamaged
	}
	return exitFailed
}

// unusable says of a file that it is there and is no ledger that this program may touch.
func unusable(err error) bool {
	var damaged *ledger.Damaged
	var foreign *ledger.Foreign
	var newer *ledger.Newer
	return errors.As(err, &damaged) || errors.As(err, &foreign) || errors.As(err, &newer) || errors.Is(err, ledger.ErrEmpty)
}

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "strayd",
		Short: "Flags daily investment returns outside their expected ranges",
		Long: `strayd reads daily returns from files, judges each against a range learnt from its series' own past,
flags what strayed, and keeps the record.

A flag is a statistical statement about past data: neither advice nor a finding of error; no flag is no certificate.`,
		Example: `  strayd demo                       a small invented book, judged from start to end
  strayd init inbox/*.csv           write a configuration from sample files, and make the ledger
  strayd check                      how the files are understood, and what each line means
  strayd pass                       read what has arrived, judge it, say what strayed
  strayd flags                      the flags that still ask something of a person
  strayd explain 12                 every figure behind a flag`,
		SilenceErrors: true,
		SilenceUsage:  true,
		Args:          cobra.NoArgs,
		PersistentPreRunE: func(cmd *cobra.Command, _ []string) error {
			a.started = true
			return a.handOver(cmd)
		},
		RunE: func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	inWords(root)
	root.PersistentFlags().StringVar(&a.configPath, "config", defaultConfig, "configuration `FILE`")
	root.PersistentFlags().StringVar(&a.nowText, "now", "", "take this `TIME` for the clock: 2026-03-13 or 2026-03-13T07:00:00Z")
	root.AddCommand(a.demoCommand(), a.initCommand(), a.checkCommand(), a.passCommand(), a.flagsCommand(), a.explainCommand(),
		a.historyCommand(), a.rangesCommand(), a.weeklyCommand(), a.drillCommand(), a.backRunCommand(), a.runCommand(), a.deskCommand(),
		a.noticesCommand(), a.ledgerCommand(), a.acceptCommand(), a.acknowledgeCommand(), a.decideCommand(), a.waiveCommand(), a.signOffCommand())
	a.completed(root)
	return root
}

// notFound turns a series that is not there into words with a cure.
func notFound(err error) error {
	var unknown *watcher.UnknownSeries
	if errors.As(err, &unknown) {
		return fmt.Errorf("%w; names are case-sensitive, `strayd ranges` lists them", err)
	}
	return err
}
