package main

import (
	"bytes"
	"context"
	"errors"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"sync"
	"syscall"
	"testing"
	"time"

	"strayd/watcher"
	"strayd/watcher/ledger"
)

// asProgram is the variable that makes the test binary run as strayd itself.
const asProgram = "STRAYD_TEST_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
	}
	os.Exit(m.Run())
}

// crashNow is when every pass of these tests takes place.
const crashNow = "2026-06-01T08:00:00Z"

// crashHome is a folder whose ledger reads a delivery.
type crashHome struct {
	*folder
	d *delivery
}

// killAt is when a pass is killed: so long after its start, or after its ledger began to grow by a large batch. Negative for never.
type killAt struct {
	after time.Duration
	grown bool
}

// child runs a pass in a process of its own and kills it. The code is -1 when the kill came before the end.
func (h *crashHome) child(t *testing.T, kill killAt) (code int, text string) {
	t.Helper()
	cmd := exec.Command(os.Args[0], "--config", filepath.Join(h.path, "strayd.yaml"), "pass", "--settled", "--now", crashNow)
	cmd.Env = append(os.Environ(), asProgram+"=1")
	var out bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &out
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	ended := make(chan struct{})
	var killer sync.WaitGroup
	killer.Go(func() { h.kill(kill, cmd.Process, ended) })
	err := cmd.Wait()
	close(ended)
	killer.Wait()
	var exit *exec.ExitError
	switch {
	case err == nil:
		return exitDone, out.String()
	case !errors.As(err, &exit):
		t.Fatal(err)
	case exit.Sys().(syscall.WaitStatus).Signal() == syscall.SIGKILL:
		return -1, out.String()
	}
	return exit.ExitCode(), out.String()
}

// kill sends SIGKILL at its moment, unless the process ends before.
func (h *crashHome) kill(at killAt, p *os.Process, ended <-chan struct{}) {
	if at.after < 0 {
		return
	}
	ledger := filepath.Join(h.path, "ledger.db")
	before := sizeOf(ledger)
	for tick := time.NewTicker(time.Millisecond); at.grown && sizeOf(ledger) < before+largeGrowth; {
		select {
		case <-tick.C:
		case <-ended:
			return
		}
	}
	select {
	case <-time.After(at.after):
		_ = p.Kill() // an error says that it has ended
	case <-ended:
	}
}

// largeGrowth is more than the small files make a ledger grow, and less than the large one does with its first commit.
const largeGrowth = 4 << 20

func sizeOf(path string) int64 {
	info, err := os.Stat(path)
	if err != nil {
		return 0
	}
	return info.Size()
}

// rounds is how many rounds of kills to make: 10, 5 with -short, or as STRAYD_CRASHES says.
func rounds(t *testing.T) int {
	if text := os.Getenv("STRAYD_CRASHES"); text != "" {
		n, err := strconv.Atoi(text)
		if err != nil || n < 1 {
			t.Fatalf("STRAYD_CRASHES is %q, want a number", text)
		}
		return n
	}
	if testing.Short() {
		return 5
	}
	return 10
}

// Kills passes at random moments. Between the kill and the next pass every file is wholly there or not at all, and the files that are
// there are the first ones; the next pass brings the rest. In the end every value is held once with its versions, the ledger
// verifies, and the flags are those of a pass that nobody disturbed.
func TestCrashes(t *testing.T) {
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	r := rand.New(rand.NewPCG(seed, 9))
	var deliveries []*delivery
	for n := range 4 {
		deliveries = append(deliveries, deliver(t, r, n%2 == 1))
	}
	var kills, staged int
	visible := map[string]int{}
	for n := range rounds(t) {
		d := deliveries[n%len(deliveries)]
		h := d.home(t, t.TempDir(), true)
		for range 1 + r.IntN(3) {
			code, text := h.child(t, d.moment(r))
			files, left := h.look(t)
			switch {
			case code > exitFailed:
				t.Fatalf("exit code %d\n%s", code, text)
			case code >= 0: // the kill came too late
				continue
			case files == 1:
				visible["none"]++
			case files == len(d.files):
				visible["all"]++
			default:
				visible["some"]++
			}
			kills++
			if left {
				staged++
			}
		}
		h.finish(t)
	}
	t.Logf("%d passes killed; of the files delivered, %v were visible then; %d kills left something staged", kills, visible, staged)
	if kills == 0 {
		t.Error("no kill came before the end of its pass")
	}
}

// moment picks when to kill: anywhere in the pass, or, where there is a large file, as often while that is written.
func (d *delivery) moment(r *rand.Rand) killAt {
	if d.files[len(d.files)-1].wide && r.IntN(2) == 0 {
		return killAt{time.Duration(r.Int64N(int64(d.lasting / 8))), true}
	}
	return killAt{time.Duration(r.Int64N(int64(d.lasting + d.lasting/8))), false}
}

// look opens the ledger for reading, as any command would after the kill, and says how many files are visible. left says that a batch
// was staged and not published.
func (h *crashHome) look(t *testing.T) (files int, left bool) {
	t.Helper()
	l, err := ledger.Open(filepath.Join(h.path, "ledger.db"), ledger.Options{Mode: ledger.ReadOnly, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	report, err := l.Verify(context.Background(), ledger.VerifyOptions{Recheck: func(v watcher.View) error { return watcher.Recheck(v, nil) }})
	if err != nil {
		t.Fatal(err)
	}
	v, err := l.Read()
	if err != nil {
		t.Fatal(err)
	}
	defer v.Close()
	err = v.Files(func(row watcher.FileRow) bool {
		if row.Outcome == watcher.Changed {
			return true
		}
		if row.File.Name != h.d.files[files].name {
			t.Fatalf("file %d of the ledger is %s, want %s", files+1, row.File.Name, h.d.files[files].name)
		}
		files++
		return files < len(h.d.files)
	})
	if err != nil {
		t.Fatal(err)
	}
	h.d.check(t, v, files)
	return files, report.Staged > 0
}

// finish runs the pass again to its end and holds the ledger against what must be held.
func (h *crashHome) finish(t *testing.T) {
	t.Helper()
	if code, out, errs := h.try("pass", "--settled", "--now", crashNow); code != exitFailed && code != exitDone { // refused then or before
		t.Fatalf("exit code %d of the pass after a kill\n%s%s", code, out, errs)
	}
	if files, left := h.look(t); files != len(h.d.files) || left {
		t.Fatalf("%d of %d files are held in the end, something staged: %v", files, len(h.d.files), left)
	}
	if flags := h.must("flags", "--all", "--format", "csv"); flags != h.d.flags {
		t.Fatalf("the flags are not those of a pass that nobody disturbed:\n%s\n%s", flags, h.d.flags)
	}
	once := map[string]bool{}
	for _, f := range h.list("flags", "--all") {
		key := f["series"] + " " + f["date"] + " " + f["kind"] + " " + f["file"]
		if f["kind"] != "refused" {
			key = f["series"] + " " + f["date"] + " " + f["kind"]
		}
		if once[key] {
			t.Fatalf("two flags for %s", key)
		}
		once[key] = true
	}
}
