package ledger

import (
	"context"
	"errors"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

func reopen(t *testing.T, path string, mode Mode) *Ledger {
	t.Helper()
	l, err := Open(path, Options{Mode: mode, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l
}

// TestBackupAndRestore copies a ledger while it is in use, changes it, and brings the copy back.
func TestBackupAndRestore(t *testing.T) {
	path, _ := furnished(t)
	copied := filepath.Join(t.TempDir(), "backup.db")
	ctx := context.Background()
	l := reopen(t, path, ReadWrite)
	before := everything(t, l)
	if r, err := l.Backup(ctx, copied); err != nil || r.Step != 5 {
		t.Fatal(r, err)
	}
	if info, err := os.Stat(copied); err != nil || info.Mode().Perm() != 0o600 {
		t.Error(info, err)
	}
	publish(t, l, &watcher.Batch{Step: 6, File: fileRow(6), Returns: []*watcher.Column{column(1, 0, 9)}})
	if _, _, err := Restore(ctx, copied, path); !errors.Is(err, ErrHeld) {
		t.Errorf("a ledger in use was replaced: %v", err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{path + ".before-restore", path + ".before-restore.2"} {
		kept, r, err := Restore(ctx, copied, path)
		if err != nil || r.Step != 5 || kept != want {
			t.Fatal(kept, r, err)
		}
	}
	if now := everything(t, reopen(t, path, ReadOnly)); !reflect.DeepEqual(now, before) {
		t.Error("the restored ledger tells something else")
	}
	if r, err := verify(path + ".before-restore"); err != nil || r.Step != 6 {
		t.Error(r, err)
	}
}

// TestRestoreDamaged: a damaged backup changes nothing; a damaged ledger, or none, can be replaced.
func TestRestoreDamaged(t *testing.T) {
	good, _ := furnished(t)
	bad, _ := furnished(t)
	f, err := os.OpenFile(bad, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	flip(t, f, bytesOfValues(t, bad)[999], 3)
	f.Close()
	ctx := context.Background()
	before, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	if _, _, err := Restore(ctx, bad, good); !isDamaged(err) {
		t.Error(err)
	}
	if now, err := os.ReadFile(good); err != nil || !reflect.DeepEqual(now, before) {
		t.Error("a damaged backup changed the ledger", err)
	}
	if kept, _, err := Restore(ctx, good, bad); err != nil || kept == "" {
		t.Error(kept, err)
	}
	if _, err := verify(bad); err != nil {
		t.Error(err)
	}
	none := filepath.Join(t.TempDir(), "none.db")
	if kept, _, err := Restore(ctx, good, none); err != nil || kept != "" {
		t.Error(kept, err)
	}
	if _, err := verify(none); err != nil {
		t.Error(err)
	}
}

func TestCompact(t *testing.T) {
	path, _ := furnished(t)
	l := reopen(t, path, ReadWrite)
	rng := rand.New(rand.NewPCG(9, 9))
	for step := uint32(6); step < 60; step++ { // states and open flags that come and go leave idle pages
		b := &watcher.Batch{Step: step, File: fileRow(step), States: []watcher.State{{Range: 1, Step: step}}}
		s := &b.States[0]
		for range 300 {
			s.N, s.Last = append(s.N, rng.Uint32()), append(s.Last, rules.Date(rng.Int32()))
			s.Sum, s.Sq = append(s.Sum, watcher.Int128{Lo: rng.Uint64()}), append(s.Sq, watcher.Int128{Hi: rng.Uint64()})
		}
		publish(t, l, b)
	}
	before := everything(t, l)
	if _, err := Compact(context.Background(), path, Options{AnyFilesystem: true}); !errors.Is(err, ErrHeld) {
		t.Errorf("a ledger in use was compacted: %v", err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	c, err := Compact(context.Background(), path, Options{AnyFilesystem: true})
	if err != nil || c.After >= c.Before {
		t.Fatal(c, err)
	}
	t.Logf("%+v", c)
	if now := everything(t, reopen(t, path, ReadOnly)); !reflect.DeepEqual(now, before) {
		t.Error("the compacted ledger tells something else")
	}
	if list, _ := filepath.Glob(filepath.Join(filepath.Dir(path), "*")); len(list) != 1 {
		t.Errorf("files are left over: %v", list)
	}
}

func TestValues(t *testing.T) {
	path, _ := furnished(t)
	v := read(t, reopen(t, path, ReadOnly))
	type cell struct {
		date   rules.Date
		series uint32
	}
	last, n := cell{rules.NoDate, 0}, 0
	err := v.Values(watcher.Returns, func(date rules.Date, series uint32, value int64) error {
		if date < last.date || date == last.date && series <= last.series && n > 0 {
			t.Fatalf("%s series %d comes after %s series %d", date, series, last.date, last.series)
		}
		last = cell{date, series}
		n++
		list, err := v.Series(watcher.Returns, series)
		if err != nil {
			return err
		}
		newest := int64(0)
		for _, x := range list {
			if x.Date == date {
				newest = x.Value
			}
		}
		if newest != value {
			t.Fatalf("%s series %d: %d, want %d", date, series, value, newest)
		}
		return nil
	})
	// Step s holds 60 s series on the dates s to s+11; on each date the largest of them counts.
	want := 0
	for date := 1; date <= 16; date++ {
		want += 60 * min(date, 5)
	}
	if err != nil || n != want {
		t.Errorf("%d values, want %d (%v)", n, want, err)
	}
	stop := errors.New("stop")
	if err := v.Values(watcher.Prices, func(rules.Date, uint32, int64) error { return stop }); !errors.Is(err, stop) {
		t.Error(err)
	}
}
