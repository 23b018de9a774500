package main

import (
	"errors"
	"fmt"
	"strings"

	"github.com/spf13/cobra"
)

// inWords gives the root command help and errors in this program's words: a flag is something a person must look at, so that
// what stands behind two hyphens is called an option.
func inWords(root *cobra.Command) {
	root.Version = version
	root.SetUsageFunc(usage)
	root.SetFlagErrorFunc(func(_ *cobra.Command, err error) error { return optionError(err) })
}

// usage writes how a command is called.
func usage(c *cobra.Command) error {
	w := c.OutOrStdout()
	fmt.Fprintf(w, "Usage:\n  %s\n", callOf(c))
	if c.HasExample() {
		fmt.Fprintf(w, "\nExamples:\n%s\n", c.Example)
	}
	if c.HasAvailableSubCommands() {
		fmt.Fprint(w, "\nCommands:\n")
		for _, sub := range c.Commands() {
			if sub.IsAvailableCommand() {
				fmt.Fprintf(w, "  %-11s %s\n", sub.Name(), sub.Short)
			}
		}
	}
	if c.HasAvailableLocalFlags() {
		fmt.Fprintf(w, "\nOptions:\n%s", c.LocalFlags().FlagUsages())
	}
	if c.HasAvailableInheritedFlags() {
		fmt.Fprintf(w, "\nOptions of every command:\n%s", c.InheritedFlags().FlagUsages())
	}
	if c.HasAvailableSubCommands() {
		fmt.Fprintf(w, "\n%s COMMAND --help says more of each.\n", c.CommandPath())
	}
	return nil
}

// callOf is the command line of a command, with its arguments.
func callOf(c *cobra.Command) string {
	if c.HasAvailableSubCommands() {
		return c.CommandPath() + " [OPTIONS] COMMAND"
	}
	_, arguments, _ := strings.Cut(c.Use, " ")
	return strings.Join(strings.Fields(c.CommandPath()+" "+arguments+" [OPTIONS]"), " ")
}

// optionWords are the library's words for options, and ours.
var optionWords = strings.NewReplacer("unknown flag", "unknown option", "unknown shorthand flag", "unknown option",
	"flag needs an argument", "option needs a value", "bad flag syntax", "option is misspelt", " flag: ", " option: ",
	"strconv.ParseFloat: parsing ", "not a number: ", "strconv.ParseInt: parsing ", "not a whole number: ", "strconv.ParseUint: parsing ", "not a whole number: ",
	": invalid syntax", "", ": value out of range", " is too large")

func optionError(err error) error { return errors.New(optionWords.Replace(err.Error())) }

// takes checks the number of arguments and says which the command takes.
func takes(least, most int) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		switch n := len(args); {
		case n < least:
			return fmt.Errorf("%d given, too few arguments: %s", n, callOf(c))
		case n > most:
			return fmt.Errorf("%q is one argument too many: %s", args[most], callOf(c))
		}
		return nil
	}
}
