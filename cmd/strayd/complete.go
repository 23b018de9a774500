package main

import (
	"bytes"
	"cmp"
	"fmt"
	"io"
	"maps"
	"slices"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/ledger"
)

// mostOffered is how many words a shell is offered at once.
const mostOffered = 500

// offer gives the words that may stand at a place of the command line, each with an optional note after a tab.
type offer func(c *config.Config, v watcher.View) ([]string, error)

// completed gives every command of the tree what a shell needs to complete its arguments and options.
func (a *app) completed(root *cobra.Command) {
	root.InitDefaultCompletionCmd()
	arguments := map[string]offer{
		"explain": both(openRefs, allSeries), "history": allSeries, "ranges": allSeries,
		"acknowledge": openRefs, "decide": openRefs, "waive": openRefs, "sign-off": openRefs,
		"pass": feedNames, "accept": refusedFiles,
	}
	options := map[string]offer{"group": groupNames, "blocking": groupNames, "series": allSeries, "feed": feedNames, "range": rangeNames,
		"kind": fixed(rules.Kinds), "standing": fixed(rules.Standings), "reason": fixed(rules.Reasons)}
	files := []string{"init", "backup", "restore", "back-run"}
	for _, cmd := range append(root.Commands(), sub(root, "ledger")...) {
		name := cmd.Name()
		switch o := arguments[name]; {
		case name == "completion":
			cmd.Short = "Print the script that completes commands in a shell"
			cmd.Long = "Prints the script that completes commands, options, series, refs, feeds and groups in a shell; its own help says where to put it."
			continue
		case o != nil:
			cmd.ValidArgsFunction = a.completing(o)
		case !slices.Contains(files, name):
			cmd.ValidArgsFunction = cobra.NoFileCompletions
		}
		for option, o := range options {
			if f := cmd.Flags().Lookup(option); f != nil && f.Value.Type() == "string" {
				cmd.RegisterFlagCompletionFunc(option, a.completing(o)) //nolint:errcheck // the option was just looked up
			}
		}
		if f := cmd.Flags().Lookup("format"); f != nil {
			cmd.RegisterFlagCompletionFunc("format", cobra.FixedCompletions(formatsOf(f.Usage), cobra.ShellCompDirectiveNoFileComp)) //nolint:errcheck // as above
		}
	}
}

func sub(root *cobra.Command, name string) []*cobra.Command {
	for _, c := range root.Commands() {
		if c.Name() == name {
			return c.Commands()
		}
	}
	return nil
}

// formatsOf reads the words of an option's text: `FORMAT`: table, csv or json.
func formatsOf(usage string) []string {
	_, list, _ := strings.Cut(usage, ": ")
	return strings.FieldsFunc(strings.ReplaceAll(list, " or ", ","), func(r rune) bool { return r == ',' || r == ' ' })
}

// completing answers a shell from the ledger, or, where a daemon holds it, from the daemon. A shell is never shown an error.
func (a *app) completing(o offer) cobra.CompletionFunc {
	return func(_ *cobra.Command, args []string, begun string) ([]string, cobra.ShellCompDirective) {
		words, there := a.completedBeside()
		if !there {
			words = a.offered(o)
		}
		kept := []string{}
		for _, w := range words {
			word, _, _ := strings.Cut(w, "\t")
			if strings.HasPrefix(word, begun) && !slices.Contains(args, word) && len(kept) < mostOffered {
				kept = append(kept, w)
			}
		}
		return kept, cobra.ShellCompDirectiveNoFileComp
	}
}

// offered asks the configuration and its ledger; without a ledger, the configuration alone.
func (a *app) offered(o offer) (words []string) {
	c, err := a.load()
	if err != nil {
		return nil
	}
	ask := func(v watcher.View) error {
		words, err = o(c, v)
		return err
	}
	if a.held == nil {
		l, err := openLedger(c, ledger.ReadOnly)
		if err != nil {
			ask(nil) //nolint:errcheck // a shell is shown no error
			return words
		}
		defer l.Close()
	}
	a.reading(func(_ *config.Config, v watcher.View) error { return ask(v) }) //nolint:errcheck // as above
	return words
}

// completedBeside has a running daemon answer. It holds the ledger, so that nobody else can.
func (a *app) completedBeside() (words []string, there bool) {
	if a.held != nil {
		return nil, false
	}
	answer := new(bytes.Buffer)
	there, err := (&app{ctx: a.ctx, out: answer, err: io.Discard, configPath: a.configPath, args: a.args}).callDaemon()
	for line := range strings.Lines(answer.String()) {
		if line = strings.TrimRight(line, "\n"); line != "" && line[0] != ':' && err == nil {
			words = append(words, line)
		}
	}
	return words, there
}

func both(one, other offer) offer {
	return func(c *config.Config, v watcher.View) ([]string, error) {
		first, err := one(c, v)
		if err != nil {
			return nil, err
		}
		second, err := other(c, v)
		return append(first, second...), err
	}
}

func fixed[T ~string](words []T) offer {
	return func(*config.Config, watcher.View) (texts []string, err error) {
		for _, w := range words {
			texts = append(texts, string(w))
		}
		return texts, nil
	}
}

func allSeries(_ *config.Config, v watcher.View) (words []string, err error) {
	if v == nil {
		return nil, nil
	}
	names, err := v.Names()
	if err != nil {
		return nil, err
	}
	for id := range uint32(names.Len()) {
		words = append(words, printable(string(names.Name(id))))
	}
	return words, nil
}

// openRefs are the refs of the flags that still ask something of a person, the newest first.
func openRefs(_ *config.Config, v watcher.View) (words []string, err error) {
	if v == nil {
		return nil, nil
	}
	err = v.Flags(false, func(g rules.Flag) bool {
		words = append(words, strconv.FormatUint(uint64(g.Ref), 10)+"\t"+printable(fmt.Sprintf("%s %s %s", g.Kind, cmp.Or(g.Series, g.File, g.Feed), g.Date)))
		return true
	})
	slices.Reverse(words)
	return words, err
}

func refusedFiles(_ *config.Config, v watcher.View) (words []string, err error) {
	if v == nil {
		return nil, nil
	}
	var refused []rules.Flag
	if err := v.Flags(false, func(g rules.Flag) bool {
		if g.Kind == rules.KindRefused {
			refused = append(refused, g)
		}
		return true
	}); err != nil {
		return nil, err
	}
	for _, g := range refused {
		row, err := v.File(g.Step)
		if err != nil {
			return nil, err
		}
		if row.Gated() { // accept takes no other
			words = append(words, printable(g.File))
		}
	}
	return words, nil
}

func feedNames(c *config.Config, _ watcher.View) (words []string, err error) {
	for _, f := range c.Feeds {
		words = append(words, f.Name)
	}
	return words, nil
}

func rangeNames(c *config.Config, _ watcher.View) (words []string, err error) {
	for _, r := range c.Ranges {
		words = append(words, r.Name)
	}
	return words, nil
}

func groupNames(c *config.Config, _ watcher.View) ([]string, error) {
	s, _, err := settings(c)
	if err != nil {
		return nil, err
	}
	known := map[string]bool{}
	for _, g := range s.Groups {
		known[g.Name] = true
	}
	for _, g := range s.Assigned {
		known[g] = true
	}
	return slices.Sorted(maps.Keys(known)), nil
}
