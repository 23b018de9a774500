package main

import (
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// aboutRecord goes with every command that enters something into the record.
const aboutRecord = `Several flags are settled together or not at all. Who did it is the user of the operating system (beside a daemon, the one at
the other end of its socket), never an option; without a daemon only the user to whom the ledger's file belongs may do it.
It is an entry of the hash-chained record, and nothing is overwritten: ` + "`strayd explain REF`" + ` shows who did what when.`

// deed is what the command line says of an act.
type deed struct {
	reason, note, override, until string
}

// settling completes a command that does one deed about flags, and gives what its options say.
func (a *app) settling(what rules.Deed, cmd *cobra.Command) (*cobra.Command, *deed) {
	d := &deed{}
	cmd.Long += "\n\n" + aboutRecord
	cmd.Args = takes(1, mostRefs)
	cmd.RunE = func(_ *cobra.Command, args []string) error { return a.act(args, d, rules.Act{Deed: what}) }
	d.options(cmd)
	return beside(cmd), d
}

func (a *app) acknowledgeCommand() *cobra.Command {
	cmd, _ := a.settling(rules.Acknowledge, &cobra.Command{
		Use:     "acknowledge REF...",
		Short:   "Say that a flag is seen and being looked at",
		Long:    "Says that flags are seen and being looked at. They still ask for a decision.",
		Example: "  strayd acknowledge 12 13 --note \"asked the administrator\"",
	})
	return cmd
}

// mostRefs is how many flags one command takes.
const mostRefs = 10_000

func (a *app) decideCommand() *cobra.Command {
	d := &deed{}
	cmd := &cobra.Command{
		Use:   "decide REF... genuine | error | corrected VALUE",
		Short: "Say what a flag turned out to be",
		Long: `genuine: the value is right, and the windows take it in full. error: it is wrong, and they leave it out. corrected: it is wrong, and they
take VALUE in its place: a fraction, or with % or bp (0.012841, 1.2841%, -35bp). The value as received is always kept.

The windows are replayed from its date. Verdicts that were issued stand; the answer lists what would now be judged otherwise.
A decision needs a reason (` + joinWords(rules.Reasons) + `) and a note. "market move" is taken only where
what the reference leaves unexplained is in range, or with --override and why.

` + aboutRecord,
		Example: "  strayd decide 12 genuine --reason \"portfolio event\" --note \"block trade, desk confirms\"\n" +
			"  strayd decide 13 14 corrected 1.2841% --reason \"data error\" --note \"administrator resent, 100 times too large\"",
		Args: takes(2, mostRefs),
		RunE: func(_ *cobra.Command, args []string) error {
			refs, act, err := parseDecision(args)
			if err != nil {
				return usageError{err}
			}
			return a.act(refs, d, act)
		},
	}
	d.options(cmd)
	cmd.Flags().StringVar(&d.override, "override", "", "why it is a market move although the residual does not say so: `TEXT`, kept marked in the record")
	return beside(cmd)
}

func (a *app) waiveCommand() *cobra.Command {
	cmd, d := a.settling(rules.Waive, &cobra.Command{
		Use:   "waive REF... --until DATE",
		Short: "Let a flag ask nothing of anyone up to a date",
		Long: `Lets flags ask nothing of anyone up to and including a date; then they are open again. Their values stay undecided.
Without --until, five business days from today. In a group with four_eyes, they ask until a second person signs the waiver off.`,
		Example: "  strayd waive 12 --until 2026-03-20 --note \"provider investigates\"",
	})
	cmd.Flags().StringVar(&d.until, "until", "", "the last `DATE` on which they ask nothing")
	return cmd
}

func (a *app) signOffCommand() *cobra.Command {
	cmd, _ := a.settling(rules.SignOff, &cobra.Command{
		Use:     "sign-off REF...",
		Short:   "Agree with what was decided",
		Long:    "Closes flags that are decided, and lets waivers hold. In a group with four_eyes, a second person must do it.",
		Example: "  strayd sign-off 12 13",
	})
	return cmd
}

func (d *deed) options(cmd *cobra.Command) {
	cmd.Flags().StringVar(&d.reason, "reason", "", "`REASON`: "+joinWords(rules.Reasons))
	cmd.Flags().StringVar(&d.note, "note", "", "`TEXT` that says more")
}

// longestNote is how many bytes a note may have.
const longestNote = 2000

// complete puts the options into an act.
func (d *deed) complete(act *rules.Act, today rules.Date) (err error) {
	act.Note, act.Override, act.Until = strings.TrimSpace(d.note), strings.TrimSpace(d.override), rules.NoDate
	if act.Deed != rules.Decide {
		act.Value = rules.Missing
	}
	if max(len(act.Note), len(act.Override)) > longestNote {
		return fmt.Errorf("a note of %d bytes is longer than %d", max(len(act.Note), len(act.Override)), longestNote)
	}
	if d.reason != "" {
		if act.Reason, err = rules.ParseReason(d.reason); err != nil {
			return err
		}
	}
	if act.Deed == rules.Waive {
		act.Until = rules.AddWeekdays(today, waiverDays)
		if d.until != "" {
			if act.Until, err = rules.ParseDate(d.until); err != nil {
				return fmt.Errorf("--until: %w", err)
			}
		}
	}
	return act.Check()
}

// waiverDays is how many business days a waiver lasts that names no date.
const waiverDays = 5

// parseDecision takes the arguments of decide apart.
func parseDecision(args []string) (refs []string, act rules.Act, err error) {
	act = rules.Act{Deed: rules.Decide, Value: rules.Missing}
	at := slices.IndexFunc(args, func(s string) bool {
		word, _, _ := strings.Cut(s, "=")
		return slices.Contains(rules.Conclusions, rules.Conclusion(word))
	})
	if at < 0 {
		return nil, act, errors.New("say what they are: genuine, error, or corrected and a value")
	}
	word, value, _ := strings.Cut(args[at], "=")
	rest := args[at+1:]
	act.Conclusion = rules.Conclusion(word)
	if act.Conclusion == rules.Corrected && value == "" && len(rest) > 0 {
		value, rest = rest[0], rest[1:]
	}
	switch {
	case len(rest) > 0:
		return nil, act, fmt.Errorf("%q is one argument too many: the refs come before %s", rest[0], word)
	case act.Conclusion == rules.Corrected && value == "":
		return nil, act, errors.New("corrected needs the value, such as 1.28% or 0.0128")
	case act.Conclusion != rules.Corrected && value != "":
		return nil, act, fmt.Errorf("%s takes no value", word)
	case value != "":
		if act.Value, err = rules.ParseUnits(value); err != nil {
			err = fmt.Errorf("corrected %w: need a value such as 1.28%%, -35bp or 0.0128", err)
		}
	}
	return args[:at], act, err
}

// joinCorrection ties a negative value to the word before it, so that it is not taken for an option.
func joinCorrection(args []string) []string {
	at := slices.Index(args, string(rules.Corrected))
	if at < 0 || at+1 >= len(args) || !slices.Contains(args[:at], "decide") {
		return args
	}
	if v := args[at+1]; len(v) < 2 || v[0] != '-' || v[1] != '.' && (v[1] < '0' || v[1] > '9') {
		return args
	}
	joined := append(slices.Clone(args[:at]), args[at]+"="+args[at+1])
	return append(joined, args[at+2:]...)
}

func parseRefs(args []string) (refs []uint64, err error) {
	for _, s := range args {
		ref, err := strconv.ParseUint(s, 10, 64)
		if err != nil {
			return nil, fmt.Errorf("%q is not a ref; `strayd flags` lists them", s)
		}
		refs = append(refs, ref)
	}
	if len(refs) == 0 {
		return nil, errors.New("no ref given; `strayd flags` lists them")
	}
	return refs, nil
}

// act carries out what somebody does about some flags.
func (a *app) act(args []string, d *deed, act rules.Act) error {
	refs, err := parseRefs(args)
	if err != nil {
		return usageError{err}
	}
	return a.entering(func(c *config.Config, p *watcher.Pass) error {
		now, err := a.today(c)
		if err != nil {
			return err
		}
		if err := d.complete(&act, now); err != nil {
			return usageError{err}
		}
		act.By = a.person()
		answer, err := p.Act(refs, act)
		if err != nil {
			return err
		}
		for _, n := range beyondAgain(&p.Settings, answer) {
			fmt.Fprintln(a.err, "note: "+n)
		}
		return a.sayActed(answer)
	})
}

// today is the day of the configuration's zone.
func (a *app) today(c *config.Config) (rules.Date, error) {
	now, err := a.now()
	if err != nil {
		return rules.NoDate, err
	}
	return rules.DateFrom(now.In(c.Location)), nil
}

// aloud leaves out the channels that print where the command itself prints what it did.
func aloud(c *config.Config, tell func(rules.ActNews) []rules.Notice) func(rules.ActNews) []rules.Notice {
	return func(news rules.ActNews) []rules.Notice {
		return slices.DeleteFunc(tell(news), func(n rules.Notice) bool {
			return slices.ContainsFunc(c.Channels, func(ch rules.Channel) bool { return ch.Name == n.Channel && ch.Kind == "console" })
		})
	}
}

// entering prepares what enters something into the record: in the daemon's turn, or, on its own, by the ledger's owner.
func (a *app) entering(do func(*config.Config, *watcher.Pass) error) error {
	return a.withLedger(ledger.ReadWrite, func(c *config.Config, l *ledger.Ledger) error {
		if c.RootForbidden && a.person().Root() {
			return errors.New("root may enter nothing into the record (root: forbidden): act as the user that you are")
		}
		p, err := a.newPass(c, l)
		if err != nil {
			return err
		}
		if a.held != nil {
			return a.inTurn(c, func() error { return do(c, p) })
		}
		p.TellActs = aloud(c, p.TellActs)
		who := a.person()
		if owner, known := ledger.Owner(c.Ledger); !known || owner != who.UID {
			return fmt.Errorf("the ledger %s does not belong to %s: without a daemon only its owner may enter anything into the record", c.Ledger, who)
		}
		return errors.Join(do(c, p), a.deliver(c, l))
	})
}
