package main

import (
	"bufio"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"time"
)

// readEvery is the pace of the commands that read beside the daemon: 20 a second, as long as the machine keeps up with them.
const readEvery = 50 * time.Millisecond

// readMost is how many of them may be under way; while there are as many, none is added.
const readMost = 8

// daemons measures one day of many series inside a running daemon while commands read its ledger: from the file being whole to the end
// of the command that has it taken, and to its notice being printed by the console channel.
func (b *bench) daemons() error {
	d, err := b.newDesk(`, schedule: "0 3 1 1 *"`)
	if err != nil {
		return err
	}
	if err := d.fresh(); err != nil {
		return err
	}
	const age = 80
	series := b.share(1_000_000)
	if err := d.fill(series, 0, age); err != nil {
		return err
	}
	r, err := d.runDaemon()
	if err != nil {
		return err
	}
	var alone, taken, told, reads []usage
	for n := range 2 * b.runs {
		k := book{series: series, from: age + n, dates: 1}
		if err := d.deliver(fmt.Sprintf("day-%d.csv", n), k); err != nil {
			return err
		}
		if n < b.runs { // nobody reads meanwhile
			u, err := d.run("pass", "--settled")
			if err != nil {
				return err
			}
			alone = append(alone, u)
			if err := r.notice(); err != nil {
				return err
			}
			continue
		}
		stop := r.read(&reads, string(name(nil, series/2)))
		start := time.Now()
		u, err := d.run("pass", "--settled")
		if err != nil {
			return err
		}
		taken = append(taken, u)
		if err := r.notice(); err != nil {
			return err
		}
		told = append(told, usage{wall: time.Since(start)})
		if err := stop(); err != nil {
			return err
		}
	}
	all, err := r.end()
	if err != nil {
		return err
	}
	b.print(figures{row: "in daemon", work: fmt.Sprintf("%d committed", series), usage: usage{wall: wallOf(alone)}, rows: series})
	b.print(figures{row: "in daemon", work: fmt.Sprintf("%d beside readers", series), usage: usage{wall: wallOf(taken)}, rows: series})
	b.print(figures{row: "in daemon", work: fmt.Sprintf("%d told", series), usage: usage{wall: wallOf(told)}, rows: series})
	b.print(figures{row: "in daemon", work: fmt.Sprintf("%d commands meanwhile", len(reads)), usage: usage{wall: wallOf(reads)}})
	b.print(figures{row: "in daemon", work: fmt.Sprintf("%d days, all of it", 2*b.runs), usage: all, rows: 2 * b.runs * series, disk: true})
	return os.RemoveAll(d.dir)
}

func wallOf(all []usage) time.Duration {
	return middle(all, func(u usage) time.Duration { return u.wall })
}

// resident is a daemon that runs.
type resident struct {
	desk  *desk
	cmd   *exec.Cmd
	began time.Time
	out   *bufio.Reader // of its console channel
	errs  strings.Builder
}

// runDaemon starts the desk's daemon and waits until its socket is there.
func (d *desk) runDaemon() (*resident, error) {
	if err := os.Mkdir(d.path("run"), 0o700); err != nil {
		return nil, err
	}
	if err := os.Setenv("RUNTIME_DIRECTORY", d.path("run")); err != nil {
		return nil, err
	}
	r := &resident{desk: d, cmd: exec.Command(d.bench.program, "run"), began: time.Now()}
	r.cmd.Dir, r.cmd.Stderr = d.dir, &r.errs
	out, err := r.cmd.StdoutPipe()
	if err != nil {
		return nil, err
	}
	r.out = bufio.NewReader(out)
	if err := r.cmd.Start(); err != nil {
		return nil, err
	}
	for range 200 {
		if there, err := filepath.Glob(d.path("run/*.sock")); err != nil || len(there) > 0 {
			return r, err
		}
		time.Sleep(readEvery)
	}
	return nil, fmt.Errorf("the daemon does not answer\n%s", r.errs.String())
}

// notice waits for the next notice: what the console prints first of it.
func (r *resident) notice() error {
	for {
		line, err := r.out.ReadString('\n')
		if err != nil || strings.HasPrefix(line, "DIGEST") {
			return err
		}
	}
}

// read has commands read until it is stopped, and notes what each took.
func (r *resident) read(into *[]usage, series string) (stop func() error) {
	end, done := make(chan struct{}), make(chan error, 1)
	go func() {
		tick := time.NewTicker(readEvery)
		defer tick.Stop()
		reads := readings{room: make(chan struct{}, readMost)}
		for n := 0; ; n++ {
			select {
			case <-end:
				reads.runs.Wait()
				*into = append(*into, reads.took...)
				done <- reads.failed
				return
			case <-tick.C:
				args := []string{"history", series}
				if n%2 == 1 {
					args = []string{"flags", "--kind", "limit"}
				}
				reads.add(func() (usage, error) { return r.desk.run(args...) })
			}
		}
	}()
	return func() error { close(end); return <-done }
}

// readings are the commands under way, and what those that have ended took.
type readings struct {
	room   chan struct{}
	runs   sync.WaitGroup
	mu     sync.Mutex
	took   []usage
	failed error
}

func (r *readings) add(run func() (usage, error)) {
	select {
	case r.room <- struct{}{}:
	default:
		return
	}
	r.runs.Go(func() {
		u, err := run()
		r.mu.Lock()
		defer r.mu.Unlock()
		if r.took = append(r.took, u); err != nil {
			r.failed = err
		}
		<-r.room
	})
}

// end stops the daemon and gives what it took in all.
func (r *resident) end() (usage, error) {
	if err := r.cmd.Process.Signal(os.Interrupt); err != nil {
		return usage{}, err
	}
	io.Copy(io.Discard, r.out) //nolint:errcheck // until it ends
	if err := r.cmd.Wait(); err != nil {
		return usage{}, fmt.Errorf("daemon: %w\n%s", err, r.errs.String())
	}
	peak, written := resources(r.cmd.ProcessState)
	return usage{time.Since(r.began), r.cmd.ProcessState.UserTime() + r.cmd.ProcessState.SystemTime(), peak, written}, nil
}
