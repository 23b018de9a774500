package ledger

import (
	"bytes"
	"context"
	"errors"
	"math/rand/v2"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"reflect"
	"strconv"
	"strings"
	"testing"
	"time"

	bolt "go.etcd.io/bbolt"
	"golang.org/x/sys/unix"

	"strayd/rules"
	"strayd/watcher"
)

// count is how many keys a bucket has, published or not.
func count(t testing.TB, l *Ledger, in bucket) (n int) {
	t.Helper()
	err := l.db.View(func(tx *bolt.Tx) error {
		return tx.Bucket(in.name()).ForEach(func(k, v []byte) error { n++; return nil })
	})
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// TestSpilledEqualsWhole publishes the same batches in one commit each and in very many: the content must be the same.
func TestSpilledEqualsWhole(t *testing.T) {
	var sums [2]totals
	for i, size := range []int{commitSize, 3000} {
		l := fresh(t)
		l.commitSize = size
		rng, ref := rand.New(rand.NewPCG(3, 4)), uint64(1)
		for step := uint32(1); step <= 4; step++ {
			publish(t, l, furnish(rng, step, &ref))
		}
		if _, err := l.Verify(context.Background(), VerifyOptions{}); err != nil {
			t.Error(err)
		}
		var err error
		if sums[i], err = l.totals(); err != nil {
			t.Fatal(err)
		}
	}
	if sums[0] != sums[1] {
		t.Errorf("totals differ: %v and %v", sums[0], sums[1])
	}
}

// errStop is raised in the middle of a batch.
var errStop = errors.New("stopped")

// stage writes a batch up to its publication and leaves it staged, as a kill would.
func stage(t *testing.T, l *Ledger, b *watcher.Batch) {
	t.Helper()
	p, err := newPlan(b)
	if err != nil {
		t.Fatal(err)
	}
	w := &writer{l: l, plan: p}
	err = w.run(func(w *writer) error {
		if err := w.accepts(p); err != nil {
			t.Fatal(err)
		}
		w.limit = 2000
		if err := w.layers(p); err != nil {
			t.Fatal(err)
		}
		if err := w.spill(); err != nil {
			t.Fatal(err)
		}
		return errStop
	})
	if !errors.Is(err, errStop) {
		t.Fatal(err)
	}
}

// everything is all that a reading tells of the furnished ledger.
func everything(t *testing.T, l *Ledger) (all []any) {
	t.Helper()
	v := read(t, l)
	defer v.Close()
	add := func(x any, err error) {
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, x)
	}
	for _, w := range []watcher.What{watcher.Returns, watcher.Prices} {
		dates, err := v.Dates(w)
		add(dates, err)
		for id := range uint32(130) {
			list, err := v.Series(w, id)
			add(list, err)
		}
		for _, d := range dates {
			dst := make([]int64, 130)
			_, err := v.Fill(w, d, 0, 0, dst)
			add(dst, err)
			add(nil, v.Patch(1, d, 0, 0, dst))
			marked, err := v.Marked(d, 0)
			add(marked, err)
			f, _, err := v.FlagAt(uint32(d), d, rules.KindBreach)
			add(f, err)
		}
	}
	used, err := v.Used(1, 3)
	add(used, err)
	scales, err := v.GroupScales(1, "g")
	add(scales, err)
	s, err := v.State(1, 0)
	add(s, err)
	n, err := v.Names()
	add(n.Len(), err)
	for _, which := range []bool{true, false} {
		add(nil, v.Flags(which, func(f rules.Flag) bool { add(f, nil); return true }))
	}
	return append(all, v.Step(), v.NextRef())
}

// TestStagedIsNotSeen stages a batch that touches everything: no reading differs, verify is content, opening sweeps it, and the
// same batch then goes in.
func TestStagedIsNotSeen(t *testing.T) {
	path := filepath.Join(t.TempDir(), "ledger.db")
	l, err := Open(path, Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	rng, ref := rand.New(rand.NewPCG(3, 4)), uint64(1)
	publish(t, l, furnish(rng, 1, &ref))
	publish(t, l, furnish(rng, 2, &ref))
	before := everything(t, l)
	keys := [buckets]int{}
	for b := range buckets {
		keys[b] = count(t, l, b)
	}
	next := furnish(rng, 3, &ref)
	stage(t, l, next)
	if count(t, l, inReturns) == keys[inReturns] || count(t, l, inFlagAt) == keys[inFlagAt] {
		t.Fatal("nothing was staged")
	}
	if now := everything(t, l); !reflect.DeepEqual(now, before) {
		t.Error("a staged batch is seen")
	}
	if r, err := l.Verify(context.Background(), VerifyOptions{}); err != nil || r.Staged == 0 {
		t.Errorf("%+v, %v", r, err)
	}
	l.Close()
	if l, err = Open(path, Options{AnyFilesystem: true}); err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	for b := range buckets {
		if n := count(t, l, b); n != keys[b] {
			t.Errorf("after opening, %s has %d keys, want %d", b, n, keys[b])
		}
	}
	publish(t, l, next)
	if _, err := l.Verify(context.Background(), VerifyOptions{}); err != nil {
		t.Error(err)
	}
}

// TestStagedIsSweptBeforeTheNext leaves a batch staged in a ledger that stays open, as a full disk does.
func TestStagedIsSweptBeforeTheNext(t *testing.T) {
	l := fresh(t)
	rng, ref := rand.New(rand.NewPCG(3, 4)), uint64(1)
	publish(t, l, furnish(rng, 1, &ref))
	next := furnish(rng, 2, &ref)
	stage(t, l, next)
	l.left = true
	publish(t, l, next)
	if r, err := l.Verify(context.Background(), VerifyOptions{}); err != nil || r.Staged != 0 {
		t.Errorf("%+v, %v", r, err)
	}
}

const childEnv = "STRAYD_LEDGER_CHILD"

// TestChild is not a test: it publishes batch after batch until it is killed, saying each step that is done.
func TestChild(t *testing.T) {
	path := os.Getenv(childEnv)
	if path == "" {
		t.Skip("only runs as the child of TestKill")
	}
	l, err := Open(path, Options{AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	l.commitSize = 20000
	for {
		v, err := l.Read()
		if err != nil {
			t.Fatal(err)
		}
		step := v.Step() + 1
		ref := v.NextRef()
		v.Close()
		if err := l.Publish(furnish(rand.New(rand.NewPCG(uint64(step), 4)), step, &ref)); err != nil {
			t.Fatal(err)
		}
		os.Stdout.WriteString("step " + strconv.Itoa(int(step)) + "\n")
	}
}

// TestKill kills a process that publishes, at random moments: each time the ledger opens, verifies, holds every step that was
// said to be done, and each step whole: the same content as a ledger that was never killed.
func TestKill(t *testing.T) {
	rounds := 20
	if n, err := strconv.Atoi(os.Getenv("STRAYD_KILL_ROUNDS")); err == nil {
		rounds = n
	}
	if testing.Short() {
		rounds = 3
	}
	path := filepath.Join(t.TempDir(), "ledger.db")
	l, err := Open(path, Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	l.Close()
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	rng := rand.New(rand.NewPCG(seed, 7))
	staged, other := 0, fresh(t)
	for range rounds {
		said := killed(t, path, time.Duration(rng.IntN(120))*time.Millisecond)
		r, err := verify(path)
		if err != nil {
			t.Fatal(err)
		}
		if r.Staged > 0 {
			staged++
		}
		if int(r.Step) < said {
			t.Fatalf("step %d was done, and the ledger is at %d", said, r.Step)
		}
		opensLike(t, path, r.Step, other)
	}
	t.Logf("%d of %d kills fell between commits of one batch", staged, rounds)
}

// killed runs the child and kills it so long after its first step; it returns the last step that it said was done.
func killed(t *testing.T, path string, after time.Duration) (said int) {
	t.Helper()
	cmd := exec.Command(os.Args[0], "-test.run=^TestChild$", "-test.timeout=60s")
	cmd.Env = append(os.Environ(), childEnv+"="+path)
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	var text bytes.Buffer
	chunk := make([]byte, 4096)
	n, _ := out.Read(chunk) // it has begun
	text.Write(chunk[:n])
	<-time.After(after)
	if err := cmd.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	_, _ = text.ReadFrom(out)
	if err := cmd.Wait(); err == nil {
		t.Fatal("the child ended by itself")
	}
	for line := range strings.Lines(text.String()) {
		if n, ok := strings.CutPrefix(line, "step "); ok && strings.HasSuffix(line, "\n") {
			said, _ = strconv.Atoi(strings.TrimSpace(n))
		} else if !ok {
			t.Fatalf("the child failed: %s", text.String())
		}
	}
	return said
}

// opensLike opens a killed ledger for writing and compares it with another that gets the same batches undisturbed.
func opensLike(t *testing.T, path string, step uint32, other *Ledger) {
	t.Helper()
	l, err := Open(path, Options{AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	r, err := l.Verify(context.Background(), VerifyOptions{})
	if err != nil || r.Staged != 0 || r.Step != step {
		t.Fatalf("%+v, %v", r, err)
	}
	v := read(t, other)
	ref, first := v.NextRef(), v.Step()+1
	v.Close()
	for s := first; s <= step; s++ {
		publish(t, other, furnish(rand.New(rand.NewPCG(uint64(s), 4)), s, &ref))
	}
	got, err := l.totals()
	want, otherErr := other.totals()
	if err != nil || otherErr != nil || got != want {
		t.Fatalf("after %d steps: %v, want %v (%v, %v)", step, got, want, err, otherErr)
	}
}

// TestFileLimit stands in for a full disk where none can be mounted: no write may go past a size, and growing the file fails. It
// runs as a child, because the limit holds for the whole process.
func TestFileLimit(t *testing.T) {
	if os.Getenv(childEnv) == "" {
		cmd := exec.Command(os.Args[0], "-test.run=^TestFileLimit$")
		cmd.Env = append(os.Environ(), childEnv+"=limit")
		if out, err := cmd.CombinedOutput(); err != nil {
			t.Errorf("%v\n%s", err, out)
		}
		return
	}
	signal.Ignore(unix.SIGXFSZ)
	defer signal.Reset(unix.SIGXFSZ)
	var old unix.Rlimit
	if err := unix.Getrlimit(unix.RLIMIT_FSIZE, &old); err != nil {
		t.Fatal(err)
	}
	for room := uint64(0); room < 3<<20; room += 400_000 {
		l := fresh(t)
		l.commitSize = 100_000
		rng, ref := rand.New(rand.NewPCG(3, 4)), uint64(1)
		publish(t, l, furnish(rng, 1, &ref))
		before := everything(t, l)
		info, err := os.Stat(l.Path())
		if err != nil {
			t.Fatal(err)
		}
		large := &watcher.Batch{Step: 2, File: fileRow(2), NewNames: names(60, 2000), Returns: history(2000, 500)}
		if err := unix.Setrlimit(unix.RLIMIT_FSIZE, &unix.Rlimit{Cur: uint64(info.Size()) + room, Max: old.Max}); err != nil {
			t.Fatal(err)
		}
		err = l.Publish(large)
		if undo := unix.Setrlimit(unix.RLIMIT_FSIZE, &old); undo != nil {
			t.Fatal(undo)
		}
		if err == nil || isDamaged(err) || !strings.Contains(err.Error(), "cannot be written") {
			t.Fatalf("with room for %d bytes: %v", room, err)
		}
		if now := everything(t, l); !reflect.DeepEqual(now, before) {
			t.Error("part of the failed step is seen")
		}
		publish(t, l, large)
		if r, err := l.Verify(context.Background(), VerifyOptions{}); err != nil || r.Staged != 0 || r.Step != 2 {
			t.Errorf("%+v, %v", r, err)
		}
	}
}

// TestDiskFull fills a small disk: Publish says so, nothing of the step is seen, and when there is room again it goes in.
func TestDiskFull(t *testing.T) {
	dir := t.TempDir()
	if err := unix.Mount("tmpfs", dir, "tmpfs", 0, "size=3m"); err != nil {
		t.Skipf("mounting a small tmpfs is not permitted here: %v", err)
	}
	defer unix.Unmount(dir, 0)
	l, err := Open(filepath.Join(dir, "ledger.db"), Options{Mode: Create})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	l.commitSize = 100_000
	rng, ref := rand.New(rand.NewPCG(3, 4)), uint64(1)
	publish(t, l, furnish(rng, 1, &ref))
	before := everything(t, l)
	if err := os.WriteFile(filepath.Join(dir, "ballast"), make([]byte, 2<<20), 0o600); err != nil {
		t.Fatal(err)
	}
	large := &watcher.Batch{Step: 2, File: fileRow(2), NewNames: names(60, 2000), Returns: history(2000, 120)}
	err = l.Publish(large)
	if !errors.Is(err, unix.ENOSPC) || isDamaged(err) {
		t.Fatalf("on a full disk: %v", err)
	}
	t.Log(err)
	if now := everything(t, l); !reflect.DeepEqual(now, before) {
		t.Error("part of the failed step is seen")
	}
	if err := os.Remove(filepath.Join(dir, "ballast")); err != nil {
		t.Fatal(err)
	}
	publish(t, l, large)
	if r, err := l.Verify(context.Background(), VerifyOptions{}); err != nil || r.Staged != 0 || r.Step != 2 {
		t.Errorf("%+v, %v", r, err)
	}
}
