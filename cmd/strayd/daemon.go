package main

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"os"
	"sync"
	"sync/atomic"
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

The chat token comes from $CREDENTIALS_DIRECTORY/slack_token, the file that STRAYD_SLACK_TOKEN_FILE names, or STRAYD_SLACK_TOKEN;
the webhook's secret and the mail server's user and password likewise (webhook_secret, mail_user, mail_password).
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
	heart   chan struct{} // a pass went well, and the heartbeat's keeper is to know
	started time.Time
	program *app
	signals *signals
	kept    watcher.Resident // between passes; for whoever holds passing
	passing chan struct{}    // full while a pass or anything else that makes notices is under way
	desk    deskPage

	mu    sync.Mutex
	setup *setup    // the last good one
	bad   string    // why the last reload was refused
	badAt time.Time // when
	seen  feedsSeen

	stopping atomic.Bool
}

// setup is a configuration with all that goes with it while it is in force.
type setup struct {
	config *config.Config
	hash   string // of the configuration
	teller *notify.Teller
	post   *postOffice
	jobs   []schedule.Job
	proxy  *pageProxy        // nil where none is believed
	owners map[string]string // whom the register names, by series; nil without one
}

// badSetting is an environment in which the configuration cannot be in force: a person must put it right.
type badSetting struct{ error }

func (a *app) daemon(listen string) error {
	if a.nowText != "" {
		return usagef("the daemon goes by the clock: --now is for single commands")
	}
	if listen != "" {
		if err := health.CheckAddress(listen); err != nil {
			return usageError{err}
		}
	}
	signals := catchSignals()
	defer signals.release()
	c, err := a.load()
	if err != nil {
		return err
	}
	l, err := openLedger(c, ledger.ReadWrite)
	if err != nil {
		return err
	}
	d := &daemon{log: slog.New(slog.NewJSONHandler(a.err, nil)), ledger: l, started: time.Now(), program: a, signals: signals,
		heart: make(chan struct{}, 1), passing: make(chan struct{}, 1)}
	d.beats.begun = make(chan struct{})
	if os.Getuid() == 0 {
		d.log.Warn("running as root: a user of its own is safer")
	}
	return errors.Join(d.serve(a.ctx, c, listen), l.Close())
}

// serve opens everything before anything runs. The ledger's lock has proved that this is the only daemon of it, so that a socket
// that is there already is stale.
func (d *daemon) serve(ctx context.Context, c *config.Config, listen string) error {
	s, err := d.prepare(c)
	if err != nil {
		return err
	}
	if url := heartbeatURL(); !url.Empty() {
		if err := health.CheckHeartbeat(url); err != nil {
			return badSetting{fmt.Errorf("STRAYD_HEARTBEAT_URL: %w", err)}
		}
	}
	if err := d.beginDeadlines(c); err != nil {
		return err
	}
	server := &desk.Server{Run: d.command, Log: d.log}
	if err := server.Listen(c.Ledger); err != nil {
		return err
	}
	var pages net.Listener
	if listen != "" {
		if pages, err = health.Listen(listen); err != nil {
			server.Close(0)
			return err
		}
		d.log.Info("health pages", "address", pages.Addr().String())
	}
	d.loop = &schedule.Loop{Jobs: s.jobs, Slots: d.ledger, Log: d.log, Beat: d.beats.beat, Panicked: d.panicked}
	d.install(s)
	if c.Page.Listen != "" {
		if err := d.openPage(c.Page.Listen); err != nil {
			server.Close(0)
			return err
		}
	}
	return d.run(ctx, server, pages)
}

// prepare makes all that goes with a configuration; nothing of it runs yet.
func (d *daemon) prepare(c *config.Config) (*setup, error) {
	_, owners, err := settings(c)
	if err != nil {
		return nil, err
	}
	jobs, err := d.jobs(c)
	if err != nil {
		return nil, err
	}
	proxy, err := openProxy(c)
	if err != nil {
		return nil, badSetting{err}
	}
	post, err := openPost(c, d.ledger, d.program.out, d.log, d.delivered)
	if err != nil {
		return nil, badSetting{err}
	}
	return &setup{config: c, hash: configHash(c), teller: newTeller(c, owners), post: post, jobs: jobs, owners: owners, proxy: proxy}, nil
}

// install puts a setup in force. The channels of the one before have ended when the new ones begin: two senders of one outbox would
// both send its notices.
func (d *daemon) install(s *setup) {
	d.mu.Lock()
	old := d.setup
	d.setup = s
	d.mu.Unlock()
	if old != nil {
		old.post.Stop()
	}
	s.post.Start()
}

// inForce is the setup in force.
func (d *daemon) inForce() *setup {
	d.mu.Lock()
	defer d.mu.Unlock()
	return d.setup
}

// alone waits until no pass is under way and keeps others from beginning until it is released.
func (d *daemon) alone(ctx context.Context) (release func(), err error) {
	select {
	case d.passing <- struct{}{}:
	case <-ctx.Done():
		return nil, ctx.Err()
	}
	return func() { <-d.passing }, nil
}

// turn is alone for a job of the daemon's own: with the set-up in force, whose channels look for notices once the job is done.
func (d *daemon) turn(ctx context.Context) (s *setup, done func(), err error) {
	release, err := d.alone(ctx)
	if err != nil {
		return nil, nil, err
	}
	s = d.inForce()
	return s, func() { s.post.Wake(); release() }, nil
}

// run has everything run until the end comes, then stops it.
func (d *daemon) run(ctx context.Context, server *desk.Server, pages net.Listener) error {
	ends := make(chan error, 3)
	working, stopWork := context.WithCancel(context.WithoutCancel(ctx))
	defer stopWork()
	telling, stopTelling := context.WithCancel(context.WithoutCancel(ctx))
	defer stopTelling()
	var work, tell sync.WaitGroup
	work.Go(func() { ends <- d.loop.Run(working) })
	work.Go(func() { ends <- server.Serve() })
	work.Go(func() { d.reloads(working) })
	work.Go(func() { d.heartbeats(working) })
	if pages != nil {
		tell.Go(func() {
			ends <- health.Serve(telling, pages, health.Handler(d.report, health.Options{Log: d.log}), d.log)
		})
	}
	tell.Go(func() {
		if err := health.Watchdog(telling, d.beats.progressed, d.log); err != nil {
			d.log.Warn("the service manager's watchdog cannot be told", "error", err)
		}
	})
	err := wait(ctx, ends)
	go d.atMost(stopMost)
	d.log.Info("stopping")
	d.stopping.Store(true)
	health.Stopping() //nolint:errcheck // nobody to tell
	stopWork()        // slots, the pass under way, reloads
	server.Close(stopCalls)
	work.Wait()
	d.inForce().post.Finish(drainMost)
	d.desk.close()
	stopTelling()
	tell.Wait()
	d.log.Info("stopped")
	return err
}

// wait returns when the context ends or a part does.
func wait(ctx context.Context, ends <-chan error) error {
	select {
	case <-ctx.Done():
		return nil
	case err := <-ends:
		return err
	}
}

// The parts of a stop, which together stay under the half minute that service managers wait: the pass under way is called off, the
// commands on the socket end, notices that can go now go, calls in hand end (callGrace), pages end (3 s).
const (
	stopCalls = 5 * time.Second
	drainMost = 5 * time.Second
	stopMost  = 25 * time.Second
)

// atMost ends the program when a stop takes too long, as a kill would: what was published stands, and the next start goes on there.
func (d *daemon) atMost(most time.Duration) {
	time.Sleep(most)
	d.log.Error("the stop takes too long: ending at once; what was published stands", "after", most.String())
	os.Exit(exitFailed)
}
