package main

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// diskPage is what a file system of memory gives out at a time.
const diskPage = 4096

// smallDisk mounts a file system of so many bytes; resize changes that.
type smallDisk struct{ path string }

func newSmallDisk(t *testing.T) *smallDisk {
	t.Helper()
	d := &smallDisk{t.TempDir()}
	if err := syscall.Mount("tmpfs", d.path, "tmpfs", 0, "size=64m"); err != nil {
		t.Skipf("a small disk needs the right to mount one: %v", err)
	}
	t.Cleanup(func() {
		if err := syscall.Unmount(d.path, 0); err != nil {
			t.Error(err)
		}
	})
	return d
}

func (d *smallDisk) resize(t *testing.T, bytes int64) {
	t.Helper()
	if err := syscall.Mount("tmpfs", d.path, "tmpfs", syscall.MS_REMOUNT, fmt.Sprintf("size=%d", bytes)); err != nil {
		t.Fatal(err)
	}
}

// used is how many bytes of it are taken.
func (d *smallDisk) used(t *testing.T) int64 {
	t.Helper()
	var s syscall.Statfs_t
	if err := syscall.Statfs(d.path, &s); err != nil {
		t.Fatal(err)
	}
	return int64(s.Blocks-s.Bfree) * s.Bsize
}

// Disks of many sizes run full at different points of a pass: while a small file is recorded, while a large one is staged, when it
// is published. Each time the error says so, the files that were published are wholly there and the
// others not at all, and the next pass, with room again, brings the rest, with the flags of a pass that nobody disturbed.
func TestDiskFull(t *testing.T) {
	disk := newSmallDisk(t)
	seed := rand.Uint64()
	t.Logf("seed %d", seed)
	d := deliver(t, rand.New(rand.NewPCG(seed, 10)), true)
	least, most := diskNeeds(t, d, disk)
	steps := int64(3)
	if testing.Short() {
		steps = 2
	}
	var sizes []int64
	for n := range steps { // the small files, the large one, and its last pages with the run record
		sizes = append(sizes, least+2*n*diskPage, (least+n*(most-least)/steps)&^(diskPage-1), most-n*diskPage)
	}
	failed := map[string]int{}
	for _, size := range sizes {
		failed[fullAt(t, d, disk, size)]++
	}
	t.Logf("disks of %d to %d KiB: %v", least>>10, most>>10, failed)
	for _, point := range []string{"no file recorded", "large file not recorded", "nothing"} {
		if failed[point] == 0 {
			t.Errorf("no disk was of a size at which the pass fails with %q", point)
		}
	}
}

// diskNeeds is how much room the ledger takes before the delivery and after it.
func diskNeeds(t *testing.T, d *delivery, disk *smallDisk) (least, most int64) {
	t.Helper()
	h := d.home(t, disk.path, true)
	least = disk.used(t)
	h.finish(t)
	most = disk.used(t)
	h.sweep()
	return least, most
}

// sweep empties the disk.
func (h *crashHome) sweep() {
	files, err := filepath.Glob(filepath.Join(h.path, "*"))
	if err != nil {
		h.t.Fatal(err)
	}
	for _, f := range files {
		if err := os.Remove(f); err != nil {
			h.t.Fatal(err)
		}
	}
}

// fullAt runs a pass on a disk of a size, and once more with room, and says what the first one failed with.
func fullAt(t *testing.T, d *delivery, disk *smallDisk, size int64) string {
	t.Helper()
	h := d.home(t, disk.path, true)
	defer h.sweep()
	disk.resize(t, size)
	code, text := h.child(t, killAt{after: -1})
	disk.resize(t, 64<<20)
	full := strings.Contains(text, syscall.ENOSPC.Error())
	if code != exitFailed || strings.Contains(text, "internal error") || strings.Contains(text, "damaged") {
		t.Fatalf("a disk of %d bytes: exit code %d\n%s", size, code, text)
	}
	files, _ := h.look(t)
	if !full && files < len(d.files) {
		t.Fatalf("a disk of %d bytes: %d of %d files are held, and the error does not say why\n%s", size, files, len(d.files), text)
	}
	h.finish(t)
	switch {
	case !full:
		return "nothing"
	case files == 1:
		return "no file recorded"
	case files < len(d.files)-1:
		return "some files recorded"
	case files < len(d.files):
		return "large file not recorded"
	}
	return "run record not written"
}
