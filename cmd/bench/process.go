package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"time"
)

// usage is what one process took.
type usage struct {
	wall, cpu time.Duration
	peak      int64 // bytes of resident memory at most, mapped pages included
	written   int64 // bytes handed to the disk
}

// desk is a folder with a configuration, an inbox and a ledger.
type desk struct {
	bench *bench
	dir   string
	feed  string // keys of the feed beyond its name and files
}

func (d *desk) path(name string) string { return filepath.Join(d.dir, name) }

// newDesk makes a folder; its ledger is made by fresh.
func (b *bench) newDesk(feed string) (*desk, error) {
	dir, err := os.MkdirTemp(b.dir, "desk-")
	if err != nil {
		return nil, err
	}
	d := &desk{b, dir, feed}
	text := "ledger: ledger.db\nfeeds:\n  - {name: book, files: \"inbox/*\", unit: fraction" + feed + "}\nranges:\n  - name: own\n"
	if err := os.WriteFile(d.path("strayd.yaml"), []byte(text), 0o644); err != nil {
		return nil, err
	}
	return d, os.Mkdir(d.path("inbox"), 0o755)
}

// fresh gives the desk an empty ledger.
func (d *desk) fresh() error {
	if err := os.RemoveAll(d.path("ledger.db")); err != nil {
		return err
	}
	_, err := d.run("init")
	return err
}

// deliver replaces what is in the inbox by one file.
func (d *desk) deliver(file string, b book) error {
	if err := d.empty(); err != nil {
		return err
	}
	return b.write(d.path("inbox/" + file))
}

func (d *desk) empty() error {
	if err := os.RemoveAll(d.path("inbox")); err != nil {
		return err
	}
	return os.Mkdir(d.path("inbox"), 0o755)
}

// run runs one command to its end.
func (d *desk) run(args ...string) (usage, error) {
	_, u, err := d.output(args...)
	return u, err
}

// output runs one command to its end and gives what it printed.
func (d *desk) output(args ...string) (string, usage, error) {
	cmd := exec.Command(d.bench.program, args...)
	cmd.Dir = d.dir
	var out, errs strings.Builder
	cmd.Stdout, cmd.Stderr = &out, &errs
	start := time.Now()
	err := cmd.Run()
	wall := time.Since(start)
	if err != nil {
		return "", usage{}, fmt.Errorf("strayd %s: %w\n%s", strings.Join(args, " "), err, errs.String())
	}
	peak, written := resources(cmd.ProcessState)
	return out.String(), usage{wall, cmd.ProcessState.UserTime() + cmd.ProcessState.SystemTime(), peak, written}, nil
}

// keep sets the ledger aside under a name; back puts a copy of it in place, written out and in the cache.
func (d *desk) keep() error { return os.Rename(d.path("ledger.db"), d.path("kept.db")) }

func (d *desk) back() error {
	from, err := os.Open(d.path("kept.db"))
	if err != nil {
		return err
	}
	defer from.Close()
	to, err := os.Create(d.path("ledger.db"))
	if err != nil {
		return err
	}
	defer to.Close()
	if _, err := to.ReadFrom(from); err != nil {
		return err
	}
	return to.Sync()
}

// size is the length of the ledger.
func (d *desk) size() (int64, error) {
	info, err := os.Stat(d.path("ledger.db"))
	if err != nil {
		return 0, err
	}
	return info.Size(), nil
}
