package ledger

import (
	"bytes"
	"context"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"
)

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
