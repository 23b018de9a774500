package main

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/watcher/desk"
)

// besideDaemon marks the commands that a running daemon carries out, because they need its ledger.
const besideDaemon = "beside a daemon"

func beside(cmd *cobra.Command) *cobra.Command {
	cmd.Annotations = map[string]string{besideDaemon: "yes"}
	return cmd
}

// handOver gives a command to the daemon that holds the ledger, if one runs. Its end comes back as an error, since the command
// itself then has nothing left to do.
func (a *app) handOver(cmd *cobra.Command) error {
	if cmd.Annotations[besideDaemon] == "" || a.held != nil {
		return nil
	}
	done, err := a.callDaemon()
	if done && err == nil {
		return quiet{exitDone}
	}
	return err
}

// callDaemon is done when a daemon carried the command out; it is not when none runs.
func (a *app) callDaemon() (done bool, err error) {
	c, err := config.Load(a.configPath, configOptions())
	if err != nil {
		return false, nil //nolint:nilerr // the command itself says what is wrong
	}
	if _, there := desk.Path(c.Ledger); !there {
		return false, nil
	}
	dir, err := os.Getwd()
	if err != nil {
		return false, err
	}
	call := desk.Call{Args: a.args, Dir: dir, Settings: configHash(c)}
	exit, err := desk.Do(a.ctx, c.Ledger, call, a.out, a.err)
	switch {
	case errors.Is(err, desk.ErrNobody):
		return false, nil
	case err != nil:
		return true, err
	case exit != 0:
		return true, quiet{exit}
	}
	return true, nil
}

// command carries out one command line that came over the control socket.
func (d *daemon) command(ctx context.Context, call desk.Call, stdout, stderr io.Writer) int {
	if call.Settings != d.inForce().hash {
		fmt.Fprintln(stderr, "strayd: this configuration is not the one that the running daemon goes by: reload the daemon (SIGHUP), or stop it")
		return exitConfig
	}
	return (&app{ctx: ctx, out: stdout, err: stderr, held: d, who: &call.Who, dir: call.Dir}).execute(call.Args)
}

// path is a file that the caller named, as seen from the caller's folder.
func (a *app) path(name string) string {
	if a.dir == "" || filepath.IsAbs(name) {
		return name
	}
	return filepath.Join(a.dir, name)
}

// configHash tells one configuration from another by all that it says.
func configHash(c *config.Config) string {
	plain := *c
	plain.File, plain.Location = "", nil
	text, err := json.Marshal(plain)
	if err != nil {
		panic(err) // plain values always encode
	}
	sum := sha256.Sum256(text)
	return hex.EncodeToString(sum[:])
}
