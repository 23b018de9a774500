package ledger

import (
	"context"
	"errors"
	"math/rand/v2"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"golang.org/x/sys/unix"

	"strayd/watcher"
)

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
	for room := uint64(0); room < 3<<20; room += 900_000 {
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
	large := &watcher.Batch{Step: 2, File: fileRow(2), NewNames: names(60, 2000), Returns: history(2000, 160)}
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

// Magic numbers: statfs(2) and linux/magic.h; ext4 and tmpfs are local.
func TestFilesystems(t *testing.T) {
	for magic, want := range map[uint32]string{0x6969: "NFS", 0x517b: "SMB", 0xff534d42: "SMB", 0xfe534d42: "SMB", 0x65735546: "FUSE",
		0x01021997: "9p", 0xef53: "", unix.TMPFS_MAGIC: ""} {
		if got := remoteName(magic); got != want {
			t.Errorf("%x: %q, want %q", magic, got, want)
		}
	}
}
