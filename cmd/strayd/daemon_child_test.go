package main

import (
	"bufio"
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"strayd/watcher/ledger"
)

// patience is how long a test waits for something that must happen; one of them waits for the next minute.
const patience = 90 * time.Second

// until waits for something to hold.
func until(t testing.TB, what string, holds func() bool) {
	t.Helper()
	tick := time.NewTicker(10 * time.Millisecond)
	defer tick.Stop()
	for end := time.After(patience); !holds(); {
		select {
		case <-tick.C:
		case <-end:
			t.Fatalf("waited for %v in vain: %s", patience, what)
		}
	}
}

// child is a daemon in a process of its own.
type child struct {
	t    testing.TB
	cmd  *exec.Cmd
	addr string // of its pages
	out  *lines // stdout
	log  *lines // stderr
	done chan struct{}
}

// lines keep what a process writes.
type lines struct {
	mu   sync.Mutex
	text bytes.Buffer
}

// Write keeps a copy of p.
func (l *lines) Write(p []byte) (int, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.text.Write(p)
}

func (l *lines) String() string {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.text.String()
}

// spawn starts the daemon of a folder and does not wait for it.
func (f *folder) spawn(env []string, args ...string) *child {
	f.t.Helper()
	c := &child{t: f.t, out: &lines{}, log: &lines{}, done: make(chan struct{})}
	c.cmd = exec.Command(os.Args[0], append([]string{"--config", filepath.Join(f.path, "strayd.yaml"), "run"}, args...)...)
	c.cmd.Env = append(append(os.Environ(), asProgram+"=1"), env...)
	c.cmd.Stdout, c.cmd.Stderr = c.out, c.log
	if err := c.cmd.Start(); err != nil {
		f.t.Fatal(err)
	}
	go func() {
		_ = c.cmd.Wait() // the state tells
		close(c.done)
	}()
	f.t.Cleanup(func() {
		_ = c.cmd.Process.Kill() // an error says that it has ended
		<-c.done
		if strings.Contains(c.log.String(), "DATA RACE") {
			f.t.Error("a race in the daemon")
		}
		if f.t.Failed() {
			f.t.Logf("log of the daemon:\n%s", c.log)
		}
	})
	return c
}

// daemon starts the daemon of a folder with its pages and waits until it is ready.
func (f *folder) daemon(env ...string) *child {
	f.t.Helper()
	c := f.spawn(env, "--listen", "127.0.0.1:0")
	until(f.t, "the daemon runs", func() bool { return c.logged("running") || c.ended() })
	if c.ended() {
		f.t.Fatalf("the daemon ended at once: %d\n%s", c.code(), c.log)
	}
	for _, e := range c.entries() {
		if e["msg"] == "health pages" {
			c.addr, _ = e["address"].(string)
		}
	}
	return c
}

func (c *child) ended() bool {
	select {
	case <-c.done:
		return true
	default:
		return false
	}
}

// code waits for the end and gives the exit code, -1 after a signal.
func (c *child) code() int {
	c.t.Helper()
	select {
	case <-c.done:
	case <-time.After(patience):
		c.t.Fatalf("the daemon does not end\n%s", c.log)
	}
	return c.cmd.ProcessState.ExitCode()
}

func (c *child) signal(s syscall.Signal) {
	c.t.Helper()
	if err := c.cmd.Process.Signal(s); err != nil {
		c.t.Fatal(err)
	}
}

// kill ends the daemon as a power cut would.
func (c *child) kill() {
	_ = c.cmd.Process.Kill() // an error says that it has ended
	<-c.done
}

// stop ends the daemon in order.
func (c *child) stop() {
	c.t.Helper()
	c.signal(syscall.SIGTERM)
	if code := c.code(); code != exitDone {
		c.t.Fatalf("the daemon stops with exit code %d\n%s", code, c.log)
	}
}

// entries are the lines of its log.
func (c *child) entries() (out []map[string]any) {
	text := c.log.String()
	for s := bufio.NewScanner(strings.NewReader(text[:strings.LastIndex(text, "\n")+1])); s.Scan(); {
		e := map[string]any{}
		if json.Unmarshal(s.Bytes(), &e) == nil {
			out = append(out, e)
		}
	}
	return out
}

// times is how often a message was logged.
func (c *child) times(msg string) (n int) {
	for _, e := range c.entries() {
		if e["msg"] == msg {
			n++
		}
	}
	return n
}

func (c *child) logged(msg string) bool { return c.times(msg) > 0 }

// get fetches a page.
func (c *child) get(page string) (status int, body string) {
	c.t.Helper()
	resp, err := http.Get("http://" + c.addr + page)
	if err != nil {
		c.t.Fatal(err)
	}
	defer resp.Body.Close()
	text, err := io.ReadAll(resp.Body)
	if err != nil {
		c.t.Fatal(err)
	}
	return resp.StatusCode, string(text)
}

// state is the page of that name.
func (c *child) state() map[string]any {
	c.t.Helper()
	_, body := c.get("/state")
	out := map[string]any{}
	if err := json.Unmarshal([]byte(body), &out); err != nil {
		c.t.Fatal(err)
	}
	return out
}

// owe makes a job of the daemon one that was last done at a time, so that the next start catches up.
func (f *folder) owe(job string, last time.Time) {
	f.t.Helper()
	l, err := ledger.Open(filepath.Join(f.path, "ledger.db"), ledger.Options{})
	if err == nil {
		err = errors.Join(l.Done(job, last), l.Close())
	}
	if err != nil {
		f.t.Fatal(err)
	}
}

// notices lists the outbox.
func (f *folder) notices(args ...string) []record {
	f.t.Helper()
	return f.list(append([]string{"notices"}, args...)...)
}

// allSent waits until no notice waits.
func (f *folder) allSent() {
	f.t.Helper()
	until(f.t, "every notice is sent", func() bool {
		return !slices.ContainsFunc(f.notices(), func(n record) bool { return n["state"] == "waiting" || n["state"] == "sending" })
	})
}

// weekday is the n-th Monday to Friday of an invented calendar.
func weekday(n int) string {
	return time.Date(2019, 1, 7+n/5*7+n%5, 0, 0, 0, 0, time.UTC).Format(time.DateOnly)
}

// csvDays is a file of small returns for the days from one to another; on the last, some series have other values.
func csvDays(series []string, from, upto int, last map[string]float64) string {
	var s strings.Builder
	s.WriteString("date,series,return\n")
	for n := from; n <= upto; n++ {
		for i, name := range series {
			v := float64((n*7+i*3)%11-5) / 1000
			if x, ok := last[name]; ok && n == upto {
				v = x
			}
			fmt.Fprintf(&s, "%s,%q,%g\n", weekday(n), name, v)
		}
	}
	return s.String()
}
