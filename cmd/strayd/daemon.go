package main

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"os"
	"os/signal"
	"sync"
	"sync/atomic"
	"syscall"
	"time"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/notify"
	"strayd/watcher"
	"strayd/watcher/desk"
	"strayd/watcher/health"
	"strayd/watcher/ledger"
	"strayd/watcher/schedule"
)

// defaultSchedule is when a feed is looked at that names no schedule.
const defaultSchedule = "*/10 * * * *"

func (a *app) runCommand() *cobra.Command {
	var listen string
	var unit bool
	cmd := &cobra.Command{
		Use:   "run",
		Short: "The daemon: passes by schedule, notices, deadlines",
		Long: `Runs until it is told to stop (SIGTERM or an interrupt; a second signal ends it at once). SIGHUP reads the configuration again;
one that is wrong is reported and the last good one stays in force.

The chat token comes from $CREDENTIALS_DIRECTORY/slack_token, the file that STRAYD_SLACK_TOKEN_FILE names, or STRAYD_SLACK_TOKEN.
STRAYD_HEARTBEAT_URL names an address that is fetched after each good pass.`,
		Example: "  strayd run\n  strayd run --listen 127.0.0.1:9301\n  strayd run --unit > /etc/systemd/system/strayd.service",
		Args:    cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			if unit {
				_, err := fmt.Fprint(a.out, health.Unit())
				return err
			}
			return a.daemon(listen)
		},
	}
	cmd.Flags().StringVar(&listen, "listen", "", "loopback `ADDRESS` of /alive, /ready, /state and /metrics, such as 127.0.0.1:9301")
	cmd.Flags().BoolVar(&unit, "unit", false, "print a systemd unit and end")
	return cmd
}

// daemon is the program while it runs unattended.
type daemon struct {
	log     *slog.Logger
	ledger  *ledger.Ledger
	loop    *schedule.Loop
	beats   beats
	started time.Time
	listen  string
	program *app

	mu      sync.Mutex
	config  *config.Config // the last good one
	hash    string         // of it
	bad     string         // why the last reload was refused
	badAt   time.Time
	teller  *notify.Teller
	post    *postOffice
	last    watcher.PassRow
	passing sync.Mutex // one pass at a time, whoever asked for it

	stopping atomic.Bool
}

func (a *app) daemon(listen string) error {
	if a.nowText != "" {
		return usagef("the daemon goes by the clock: --now is for single commands")
	}
	c, err := a.load()
	if err != nil {
		return err
	}
	l, err := openLedger(c, ledger.ReadWrite)
	if err != nil {
		return err
	}
	d := &daemon{log: slog.New(slog.NewJSONHandler(a.err, nil)), ledger: l, started: time.Now(), listen: listen, program: a}
	if os.Getuid() == 0 {
		d.log.Warn("running as root: a user of its own is safer")
	}
	return errors.Join(d.serve(a.ctx, c), l.Close())
}

// serve starts everything in the order that proves that this is the only daemon, waits for the end, and stops in reverse.
func (d *daemon) serve(ctx context.Context, c *config.Config) error {
	if err := d.adopt(c); err != nil {
		return err
	}
	server := &desk.Server{Run: d.command, Log: d.log}
	if err := server.Listen(c.Ledger); err != nil {
		return err
	}
	jobs, err := d.jobs(c)
	if err != nil {
		return err
	}
	d.loop = &schedule.Loop{Jobs: jobs, Slots: d.ledger, Log: d.log, Beat: d.beats.beat, Panicked: d.panicked}
	ends := make(chan error, 3)
	running, stop := context.WithCancel(context.WithoutCancel(ctx))
	defer stop()
	var parts sync.WaitGroup
	part := func(f func() error) { parts.Go(func() { ends <- f() }) }
	part(server.Serve)
	part(func() error { return d.loop.Run(running) })
	if d.listen != "" {
		l, err := health.Listen(d.listen)
		if err != nil {
			return err
		}
		d.log.Info("health pages", "address", l.Addr().String())
		part(func() error {
			return health.Serve(running, l, health.Handler(d.report, health.Options{Log: d.log}), d.log)
		})
	}
	parts.Go(func() {
		if err := health.Watchdog(running, d.beats.progressed, d.log); err != nil {
			d.log.Warn("the service manager's watchdog cannot be told", "error", err)
		}
	})
	d.reloads(running, &parts)
	d.sayReady(c)
	err = d.wait(ctx, ends)
	d.log.Info("stopping")
	d.stopping.Store(true)
	health.Stopping() //nolint:errcheck // nobody to tell
	stop()
	d.post.Stop()
	server.Close(stopCalls)
	parts.Wait()
	return err
}

// stopCalls is how long commands on the socket may take to end.
const stopCalls = 3 * time.Second

// wait returns when the context ends or a part fails. From then on a second signal ends the program at once.
func (d *daemon) wait(ctx context.Context, ends chan error) (err error) {
	select {
	case <-ctx.Done():
	case err = <-ends:
	}
	second := make(chan os.Signal, 1)
	signal.Notify(second, os.Interrupt, syscall.SIGTERM)
	go func() {
		<-second
		d.log.Error("a second signal: ending at once; what was published stands")
		os.Exit(exitFailed)
	}()
	return err
}

func (d *daemon) sayReady(c *config.Config) {
	d.log.Info("running", "ledger", c.Ledger, "feeds", len(c.Feeds), "channels", len(c.Channels))
	if err := health.Ready(); err != nil {
		d.log.Warn("the service manager cannot be told", "error", err)
	}
	for _, n := range c.Later {
		d.log.Info("set, and not acted on by this version", "key", n.Path, "line", n.Line, "what", n.Text)
	}
}

// reloads reads the configuration again at each SIGHUP.
func (d *daemon) reloads(ctx context.Context, parts *sync.WaitGroup) {
	hup := make(chan os.Signal, 1)
	signal.Notify(hup, syscall.SIGHUP)
	parts.Go(func() {
		defer signal.Stop(hup)
		for {
			select {
			case <-ctx.Done():
				return
			case <-hup:
				d.reload()
			}
		}
	})
}

// reload takes a good new configuration over as a whole, and keeps the last good one otherwise.
func (d *daemon) reload() {
	health.Reloading()   //nolint:errcheck // nobody to tell
	defer health.Ready() //nolint:errcheck // as above
	d.mu.Lock()
	file, old := d.config.File, d.config
	d.mu.Unlock()
	c, err := (&app{configPath: file}).load()
	if err == nil && c.Ledger != old.Ledger {
		err = fmt.Errorf("the ledger changed from %s to %s: that takes a restart", old.Ledger, c.Ledger)
	}
	var jobs []schedule.Job
	if err == nil {
		jobs, err = d.jobs(c)
	}
	if err == nil {
		err = d.loop.Swap(jobs)
	}
	if err == nil {
		err = d.adopt(c)
	}
	d.mu.Lock()
	defer d.mu.Unlock()
	if err != nil {
		d.bad, d.badAt = err.Error(), time.Now()
		d.log.Error("the configuration is wrong: the last good one stays in force", "error", err)
		return
	}
	d.bad, d.badAt = "", time.Time{}
	d.log.Info("configuration read again")
}

// adopt makes a configuration the one in force.
func (d *daemon) adopt(c *config.Config) error {
	s, err := settings(c)
	if err != nil {
		return err
	}
	post, err := openPost(c, d.ledger, d.program.out, d.log, d.delivered)
	if err != nil {
		return err
	}
	d.mu.Lock()
	old := d.post
	d.config, d.hash, d.post = c, configHash(c), post
	d.teller = newTeller(c, ownersOf(s.Register))
	d.mu.Unlock()
	if old != nil {
		old.Stop()
	}
	post.Start()
	return nil
}

// delivered tells the other channels of one that died.
func (d *daemon) delivered(e notify.Event) {
	if !e.Stopped {
		return
	}
	_, teller, post := d.inForce()
	word := notify.Word{At: time.Now(), Key: "dead " + e.Channel + " " + time.Now().Format(time.DateOnly), But: e.Channel,
		Lines: []string{fmt.Sprintf("Channel %s delivers nothing: %s", e.Channel, e.Reason), "Its notices wait. `strayd notices` lists them."}}
	if err := d.ledger.Add(teller.Word(word)); err != nil {
		d.log.Error("the outbox cannot be written", "error", err)
	}
	post.Wake()
}

func (d *daemon) wake() {
	_, _, post := d.inForce()
	post.Wake()
}

// inForce is the configuration in force with what goes with it.
func (d *daemon) inForce() (*config.Config, *notify.Teller, *postOffice) {
	d.mu.Lock()
	defer d.mu.Unlock()
	return d.config, d.teller, d.post
}

func (d *daemon) panicked(job string, value any) {
	d.log.Error("a pass ended in an internal error; the next one runs as planned", "job", job, "error", fmt.Sprint(value))
}
