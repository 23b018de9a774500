package main

import (
	"errors"
	"fmt"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

func (a *app) passCommand() *cobra.Command {
	var settled bool
	cmd := &cobra.Command{
		Use:   "pass [FEED]",
		Short: "Read what has arrived, judge it, say what strayed",
		Long: `One pass now over one feed or all of them: every whole new file is read, judged and recorded as one step.
The same content again changes nothing. A file with a bad row changes nothing either and raises one flag.

Exit code 1 when a file was refused or could not be read; flags do not change it.`,
		Example: "  strayd pass\n  strayd pass administrator --settled      the files are whole, whatever their age",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			only := ""
			if len(args) == 1 {
				only = args[0]
			}
			return a.pass(only, settled)
		},
	}
	cmd.Flags().BoolVar(&settled, "settled", false, "take my word that every file is whole")
	return beside(cmd)
}

func (a *app) pass(only string, settled bool) error {
	return a.withLedger(ledger.ReadWrite, func(c *config.Config, l *ledger.Ledger) error {
		if only != "" && c.FeedKey(only) == "" {
			return usagef("no feed %q in %s", only, c.File)
		}
		if a.held != nil {
			return a.passBeside(c, only, settled)
		}
		err := a.passOver(c, l, only, settled)
		return errors.Join(err, a.deliver(c, l))
	})
}

// passBeside makes a pass in the daemon's turn; its notices are the daemon's to deliver.
func (a *app) passBeside(c *config.Config, only string, settled bool) error {
	return a.inTurn(c, func() error { return a.passOver(c, a.held.ledger, only, settled) })
}

// inTurn does something that writes beside a daemon, when no pass is under way there, and has the daemon send what came of it.
func (a *app) inTurn(c *config.Config, do func() error) error {
	d := a.held
	release, err := d.alone(a.ctx)
	if err != nil {
		return err
	}
	defer release()
	s := d.inForce()
	if s.config != c {
		return badSetting{errors.New("the daemon took another configuration over meanwhile: give the command again")}
	}
	defer s.post.Wake()
	return do()
}

// passOver runs one pass over an open ledger and prints what became of each file.
func (a *app) passOver(c *config.Config, l *ledger.Ledger, only string, settled bool) error {
	p, err := a.newPass(c, l)
	if err != nil {
		return err
	}
	p.Only, p.Settled = only, settled
	bars := newBars(a.err)
	p.Progress = func(work string, done, total int64) {
		bars.progress(work, done, total)
		if a.held != nil {
			a.held.beats.beat()
		}
	}
	p.Report = func(r watcher.FileReport) {
		bars.clear()
		a.sayFile(r)
		if a.held != nil {
			a.held.inForce().post.Wake()
		}
	}
	row, err := p.Run(a.ctx)
	bars.clear()
	a.sayPass(row)
	if err == nil && a.held == nil {
		err = firstError(a.deadlines(c, l, p), escalate(c, l, newTeller(c, nil), p.Now))
	}
	if err == nil && row.Refused > 0 {
		return quiet{exitFailed}
	}
	return err
}

func (a *app) newPass(c *config.Config, l watcher.Store) (*watcher.Pass, error) {
	now, err := a.now()
	if err != nil {
		return nil, err
	}
	s, owners, err := settings(c)
	if err != nil {
		return nil, err
	}
	teller := newTeller(c, owners)
	p := &watcher.Pass{Store: l, Source: source{}, Settings: s, Feeds: c.Feeds, FeedKey: config.FeedKey, Now: now, Zone: c.Location,
		Who: a.person().String(), Program: version, Tell: teller.Notices, TellActs: teller.Updates}
	if a.held != nil {
		p.Resident = &a.held.kept
	}
	return p, nil
}

func (a *app) sayFile(r watcher.FileReport) {
	name := printable(r.Name)
	switch r.Fate {
	case watcher.FateAccepted:
		n := r.Row.Counts
		fmt.Fprintf(a.out, "%s: %s, %s new, %s late, %s restated, %s unchanged; %s\n", name, rules.Counted(n.Rows, "row"), rules.Thousands(n.New), rules.Thousands(n.Late),
			rules.Thousands(n.Restated), rules.Thousands(n.Same), rules.Counted(n.Flags, "flag"))
		for _, note := range r.Notes {
			fmt.Fprintf(a.err, "%s: %s\n", name, printable(note))
		}
	case watcher.FateRefused:
		fmt.Fprintf(a.err, "refused, nothing of it is kept: %s\n", printable(r.Why))
	case watcher.FateChecked:
		fmt.Fprintln(a.out, r.Why)
	case watcher.FateWaiting:
		fmt.Fprintf(a.err, "waiting: %s: %s\n", name, r.Why)
	}
}

// sayPass prints the pass in one line, with the verdicts counted.
func (a *app) sayPass(row watcher.PassRow) {
	n := row.Counts
	fmt.Fprintf(a.out, "%s accepted, %d refused, %d waiting. ", rules.Counted(row.Accepted, "file"), row.Refused, row.Waiting)
	if row.Accepted == 0 {
		fmt.Fprintln(a.out, "Nothing new to judge.")
		return
	}
	fmt.Fprintf(a.out, "Verdicts: %s inside, %s watch, %s, %s not judged. %s raised.\n", rules.Thousands(n.Inside), rules.Thousands(n.Watch),
		rules.Counted(n.Breach, "breach"), rules.Thousands(n.NotJudged), rules.Counted(n.Flags, "flag"))
}
