package main

import (
	"fmt"
	"path"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
)

func (a *app) acceptCommand() *cobra.Command {
	d := &deed{}
	cmd := &cobra.Command{
		Use:   "accept FILE",
		Short: "Release a refused file",
		Long: `Takes a file that was refused because of what is held (its size against the past, its dates, who is missing), by its name or its path. Its
form is checked as ever: a file that cannot be read as declared is never taken. The file must still be in its feed's folder, unchanged.
It is judged at once, and the release is entered into the record with it.

` + aboutRecord,
		Example: "  strayd accept returns-2026-03-11.csv --note \"two funds closed, the administrator confirms\"",
		Args:    takes(1, 1),
		RunE:    func(_ *cobra.Command, args []string) error { return a.accept(args[0], d) },
	}
	d.options(cmd)
	return beside(cmd)
}

func (a *app) accept(file string, d *deed) error {
	if strings.TrimSpace(d.note) == "" {
		return usagef("accept needs --note: why the file is right")
	}
	return a.entering(func(c *config.Config, p *watcher.Pass) error {
		feed, name, err := a.feedOf(c, file)
		if err != nil {
			return usageError{err}
		}
		act := rules.Act{Deed: rules.Accept, By: a.person()}
		if err := d.complete(&act, rules.NoDate); err != nil {
			return usageError{err}
		}
		p.Report = a.sayFile
		answer, err := p.Release(a.ctx, feed, name, act)
		if err != nil {
			return err
		}
		return a.sayActed(answer)
	})
}

// feedOf is the feed of a file that is named by its path; "" where only its name is given.
func (a *app) feedOf(c *config.Config, file string) (feed, name string, err error) {
	name = filepath.Base(file)
	if !strings.ContainsRune(file, filepath.Separator) {
		return "", name, nil
	}
	full, err := filepath.Abs(a.path(file))
	if err != nil {
		return "", name, err
	}
	for _, f := range c.Feeds {
		if fits, err := path.Match(f.Pattern, name); err == nil && fits && f.Dir == filepath.Dir(full) {
			return f.Name, name, nil
		}
	}
	return "", name, fmt.Errorf("%s is a file of no feed in %s", file, c.File)
}
