package main

import (
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
)

// checking is what check is asked for.
type checking struct{ settled, schema, example, send bool }

func (a *app) checkCommand() *cobra.Command {
	var asked checking
	cmd := &cobra.Command{
		Use:   "check",
		Short: "Check the configuration and the feeds, and say what each line means",
		Long: `Checks the configuration, reads what lies in the feeds without storing any of it, and says each line in every form,
with the flags to expect of it in a week. Asks the chat service, where there is a token for it, whether notices would arrive; with --send a test
notice tells. Exit code 78 when the configuration is wrong, 1 when a file would be refused or a test did not arrive.`,
		Example: "  strayd check\n  strayd check --send\n  strayd check --example > strayd.yaml      a configuration to begin with\n" +
			"  strayd check --schema > strayd.schema.json",
		Args: takes(0, 0),
		RunE: func(*cobra.Command, []string) error {
			switch {
			case asked.schema:
				_, err := a.out.Write(config.Schema())
				return err
			case asked.example:
				_, err := io.WriteString(a.out, config.Starter)
				return err
			}
			return a.check(asked)
		},
	}
	cmd.Flags().BoolVar(&asked.settled, "settled", false, "take my word that every file is whole")
	cmd.Flags().BoolVar(&asked.send, "send", false, "post a test notice to every channel")
	cmd.Flags().BoolVar(&asked.schema, "schema", false, "print the JSON Schema of the configuration, and nothing else")
	cmd.Flags().BoolVar(&asked.example, "example", false, "print a commented configuration to begin with, and nothing else")
	return cmd
}

func (a *app) check(asked checking) error {
	c, err := a.load()
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s is right.\n\n", c.File)
	names, held := heldNames(c)
	refused, err := a.checkFeeds(c, names, asked.settled)
	if err != nil {
		return err
	}
	if held != nil {
		fmt.Fprintf(a.out, "ledger: %v\n", held)
	} else {
		fmt.Fprintf(a.out, "ledger: %s, %s held\n", c.Ledger, rules.Counted(names.held, "series"))
	}
	refused += a.checkChannels(c, asked.send)
	if err := a.sayWeekly(c); err != nil {
		return err
	}
	if err := a.sayLines(c, names.Names); err != nil {
		return err
	}
	if err := a.sayStrangers(c, names.Names); err != nil {
		return err
	}
	if refused > 0 {
		return quiet{exitFailed}
	}
	return nil
}
