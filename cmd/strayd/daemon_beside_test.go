package main

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"
)

// answer is what a command line gave.
type answer struct {
	code      int
	out, errs string
}

func (f *folder) answers(lines []string) (out []answer) {
	for _, line := range lines {
		code, text, errs := f.try(strings.Fields(line)...)
		out = append(out, answer{code, text, errs})
	}
	return out
}

// Commands give the same bytes and exit codes with a daemon and without.
func TestBesideDaemonSameAnswers(t *testing.T) {
	socketFolder(t)
	f := deskFolder(t)
	series, out := storm()
	f.arrive("a.csv", csvDays(append(series, hostile), 0, 30, out))
	f.write("inbox/bad.csv", "date,series,return\n2019-03-04,fund-00,1,5\n")
	if code, _, _ := f.try("pass", "--settled"); code != exitFailed {
		t.Fatalf("exit code %d of a pass over a bad file", code)
	}
	var lines []string
	for _, format := range []string{"table", "csv", "json"} {
		for _, command := range []string{"flags", "flags --all", "flags --kind breach --from 2019-02-01", "flags --series nobody", "history fund-03",
			"history nobody", "ranges", "ranges fund-01", "explain 1", "explain 99", "explain fund-02 " + weekday(30),
			"explain fund-02 " + weekday(60), "notices", "notices --state sent"} {
			lines = append(lines, command+" --format "+format)
		}
	}
	const drill = "drill --days 8 --kinds x100,x10000 --gap 5 --format csv"
	lines = append(lines, drill, "ledger verify", "ledger verify --head 00", "ledger export", "ledger export --what prices", "flags --format xml",
		"flags --blocking nobody", "flags --kind nothing", "explain", "explain 1 2 3", "history", "notices again x", "pass nobody")
	f.daemon().stop() // so that what it remembers of its own is in the ledger in both cases
	alone := f.answers(lines)
	d := f.daemon()
	for i, beside := range f.answers(lines) {
		if beside != alone[i] {
			t.Errorf("strayd %s\nwithout a daemon: %v\nwith one: %v", lines[i], alone[i], beside)
		}
	}
	if out := f.must(strings.Fields(drill)...); !strings.Contains(out, "kind,x100,") {
		t.Errorf("nothing is planted beside a daemon:\n%s", out)
	}
	if code, _, errs := f.try("flags", "--now", "2026-03-01"); code != exitUsage || !strings.Contains(errs, "--now") {
		t.Errorf("--now: %d %s", code, errs)
	}
	backup := filepath.Join(f.path, "copy.db")
	f.must("ledger", "backup", backup)
	if _, err := os.Stat(backup); err != nil {
		t.Error(err)
	}
	f.configure(strings.Replace(deskConfig(), "window: 20", "window: 21", 1))
	if code, out, errs := f.try("flags"); code != exitConfig || out != "" || !strings.Contains(errs, "reload the daemon") {
		t.Errorf("another configuration: %d %s%s", code, out, errs)
	}
	for _, command := range [][]string{{"ledger", "compact"}, {"run"}, {"ledger", "restore", backup}} {
		f.configure(deskConfig())
		if code, _, errs := f.try(command...); code != exitHeld {
			t.Errorf("%v beside a daemon: %d %s", command, code, errs)
		}
	}
	d.stop()
}

// Files of two hundred thousand rows go in while commands read: each reading sees a file wholly or not at all, and pages answer
// meanwhile.
func TestBesideDaemonReaders(t *testing.T) {
	socketFolder(t)
	f := deskFolder(t)
	d := f.daemon()
	const files, series, dates = 5, 1000, 200
	var names []string
	for n := range files * series {
		names = append(names, fmt.Sprintf("s-%04d", n))
	}
	for n := range files {
		f.write(fmt.Sprintf("inbox/%d.csv", n), csvDays(names[n*series:(n+1)*series], 0, dates-1, nil))
	}
	ended := make(chan time.Duration)
	go func() {
		start := time.Now()
		f.try("pass", "--settled")
		ended <- time.Since(start)
	}()
	var readers sync.WaitGroup
	var mu sync.Mutex
	seen := map[int]int{}
	pages := 0
	tick := time.NewTicker(50 * time.Millisecond) // 20 a second
	defer tick.Stop()
	for running := true; running; {
		select {
		case took := <-ended:
			readers.Wait()
			t.Logf("the pass took %v beside %v readings (rows: readings) and %d pages", took, seen, pages)
			running = false
		case <-tick.C:
			name := names[(pages*373)%len(names)]
			readers.Go(func() {
				_, out, _ := f.try("history", name, "--format", "csv")
				mu.Lock()
				defer mu.Unlock()
				seen[max(0, strings.Count(out, "\n")-1)]++
			})
			for _, page := range []string{"/ready", "/state", "/metrics", "/alive"} {
				if code, body := d.get(page); code != 200 {
					t.Errorf("%s answers %d: %s", page, code, body)
				}
				pages++
			}
		}
	}
	for rows := range seen {
		if rows != 0 && rows != dates {
			t.Errorf("a reading saw %d of %d dates", rows, dates)
		}
	}
	if len(f.list("history", names[len(names)-1])) != dates {
		t.Error("the last file is not there in the end")
	}
	if last, ok := d.state()["last_pass"].(map[string]any); !ok || last["accepted"] != float64(files) {
		t.Errorf("/state: last pass %v", d.state()["last_pass"])
	}
	d.stop()
}
