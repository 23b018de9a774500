package main

import (
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher/ledger"
)

func (a *app) demoCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "demo [FOLDER]",
		Short: "A small invented book, judged from start to end",
		Long: `Writes an invented book of 24 funds into a fresh folder: a configuration, a year of history, and a week of daily files with
errors planted in them. Then it makes the ledger and runs one pass a day, printing what strayed. Everything stays in the folder,
to be tried with the other commands.`,
		Example: "  strayd demo\n  strayd demo /tmp/book",
		Args:    takes(0, 1),
		RunE: func(_ *cobra.Command, args []string) error {
			folder := "strayd-demo"
			if len(args) == 1 {
				folder = args[0]
			}
			return a.demo(folder)
		},
	}
}

func (a *app) demo(folder string) error {
	if _, err := os.Lstat(folder); err == nil {
		return fmt.Errorf("%s is there already; remove it, or name another folder: strayd demo FOLDER", folder)
	}
	if err := os.MkdirAll(filepath.Join(folder, "inbox"), 0o755); err != nil {
		return err
	}
	a.configPath = filepath.Join(folder, "strayd.yaml")
	for name, text := range map[string]string{"strayd.yaml": demoConfig, "series.csv": demoRegister(), "events.csv": demoEvents()} {
		if err := os.WriteFile(filepath.Join(folder, name), []byte(text), 0o644); err != nil {
			return err
		}
	}
	c, err := a.load()
	if err != nil {
		return err
	}
	l, err := openLedger(c, ledger.Create)
	if err != nil {
		return err
	}
	return errors.Join(a.demoWeek(c, l, folder), l.Close())
}

// demoWeek runs a week as the daemon would, without waiting for it: what arrives is read, deadlines pass, notices go to the console.
func (a *app) demoWeek(c *config.Config, l *ledger.Ledger, folder string) error {
	fmt.Fprintf(a.out, "An invented book in %s: 24 funds in 3 groups, a year of history, then one week. What the desk would read is set off by a bar.\n", folder)
	for _, s := range newBook().scenes() {
		a.nowText = s.at.Format(time.RFC3339)
		fmt.Fprintf(a.out, "\n%s  %s\n", s.at.Format("Mon 2 Jan 2006 15:04"), s.story)
		if err := a.play(c, l, folder, s); err != nil {
			return err
		}
		if err := a.chat(c, l, s.at); err != nil {
			return err
		}
	}
	fmt.Fprintf(a.out, "\n%s\n\nLook further (from the source, write go run ./cmd/strayd for strayd):\n", caution)
	for _, next := range []string{"flags", "explain 27", "history birch-income --from 2026-03-09", "ranges --now 2026-03-16", "weekly 2026-W11", "ledger verify"} {
		fmt.Fprintf(a.out, "  strayd --config %s %s\n", filepath.Join(folder, "strayd.yaml"), next)
	}
	return nil
}

// play lets one scene happen.
func (a *app) play(c *config.Config, l *ledger.Ledger, folder string, s scene) error {
	switch {
	case s.name != "":
		if err := os.WriteFile(filepath.Join(folder, "inbox", s.name), []byte(s.content), 0o644); err != nil {
			return err
		}
		if err := a.passOver(c, l, "", true); err != nil && !isQuiet(err) {
			return err
		}
	case s.due != rules.NoDate:
		p, err := a.newPass(c, l)
		if err != nil {
			return err
		}
		return p.Deadline(c.Feeds[0], s.due, s.at)
	case s.line:
		news, err := dayNews(c, l, nil, s.at)
		if err != nil {
			return err
		}
		return l.Add(newTeller(c, nil).Daily(news))
	}
	return nil
}

func isQuiet(err error) bool {
	var q quiet
	return errors.As(err, &q)
}

// chat prints the waiting notices as the desk would see them.
func (a *app) chat(c *config.Config, l *ledger.Ledger, now time.Time) error {
	bar := &prefixed{w: a.out, prefix: "  | "}
	desk := &app{ctx: a.ctx, out: bar, err: a.err}
	for _, ch := range c.Channels {
		if err := desk.toConsole(l, ch, now); err != nil {
			return err
		}
	}
	return nil
}

// prefixed writes each line behind a prefix. Every write ends a line.
type prefixed struct {
	w      io.Writer
	prefix string
}

// Write writes whole lines.
func (p *prefixed) Write(b []byte) (int, error) {
	lines := strings.Split(strings.TrimSuffix(string(b), "\n"), "\n")
	_, err := io.WriteString(p.w, p.prefix+strings.Join(lines, "\n"+p.prefix)+"\n")
	return len(b), err
}
