package main

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"slices"
	"time"

	"strayd/rules"
	"strayd/rules/drill"
	"strayd/watcher"
)

// send writes the file of a feed for a date, unless it does not come or comes late.
func (r *drillRun) send(f rules.Feed, t int) error {
	text, rows := r.planted.Text(f.Name, t, t+1)
	if p := r.plan.File(f.Name, t); p != nil {
		switch p.Kind {
		case drill.TruncatedFile:
			text = r.planted.Broken(f.Name, t, p.Keep, p.Torn)
		default:
			return nil
		}
	}
	if rows == 0 {
		return nil
	}
	return r.write(f, t, "", text)
}

func (r *drillRun) write(f rules.Feed, t int, again, text string) error {
	return os.WriteFile(filepath.Join(f.Dir, r.truth.Dates[t].String()+again+".csv"), []byte(text), 0o600)
}

// resend sends refused files again as they should have been, except in the middle of days on which the sender goes on being wrong.
func (r *drillRun) resend(t int, refused []watcher.FileReport, at time.Time) error {
	sent := false
	for _, f := range r.config.Feeds {
		if !slices.ContainsFunc(refused, func(b watcher.FileReport) bool { return b.Feed == f.Name }) || r.plan.Lasts(f.Name, t) {
			continue
		}
		text, _ := r.truth.Text(f.Name, t, t+1)
		if err := r.write(f, t, "-again", text); err != nil {
			return err
		}
		sent = true
	}
	if !sent {
		return nil
	}
	_, err := r.pass(t, at)
	return err
}

func (r *drillRun) late(t int, at time.Time) error {
	came := false
	for _, f := range r.config.Feeds {
		if p := r.plan.File(f.Name, t); p != nil && p.Kind == drill.LateFile {
			text, _ := r.planted.Text(f.Name, t, t+1)
			if err := r.write(f, t, "-late", text); err != nil {
				return err
			}
			came = true
		}
	}
	if !came {
		return nil
	}
	_, err := r.pass(t, at)
	return err
}

// empty takes the day's files away, so that the next pass need not look at them.
func (r *drillRun) empty() error {
	for _, f := range r.config.Feeds {
		files, err := filepath.Glob(filepath.Join(f.Dir, "*.csv"))
		if err != nil {
			return err
		}
		for _, file := range files {
			if err := os.Remove(file); err != nil {
				return err
			}
		}
	}
	return nil
}

// copyLedger copies a closed ledger.
func copyLedger(from, to string) (err error) {
	in, err := os.Open(from)
	if err != nil {
		return err
	}
	defer in.Close()
	out, err := os.OpenFile(to, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o600)
	if err != nil {
		return err
	}
	_, err = io.Copy(out, in)
	return errors.Join(err, out.Close())
}
