package ledger

import (
	"errors"
	"path/filepath"
	"sync"
	"sync/atomic"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// TestReadersWhileWriting: step s restates every cell of three dates as s, in several commits. Whatever a reading sees must be
// of its own step, while one reading stays open throughout and the file grows.
func TestReadersWhileWriting(t *testing.T) {
	const steps, cells = 12, 600
	l := fresh(t)
	l.commitSize = 3000
	first := read(t, l)
	var done atomic.Bool
	var readers sync.WaitGroup
	for range 3 {
		readers.Go(func() {
			for !done.Load() {
				if err := consistent(l, cells); err != nil {
					t.Error(err)
					return
				}
			}
		})
	}
	for s := uint32(1); s <= steps; s++ {
		b := &watcher.Batch{Step: s, File: fileRow(s)}
		if s == 1 {
			b.NewNames = names(0, cells)
		}
		for date := range 3 {
			c := &watcher.Column{Date: rules.Date(date), Decimals: 15, V32: make([]int32, cells)}
			for i := range c.V32 {
				c.V32[i] = int32(s)
			}
			b.Returns = append(b.Returns, c)
		}
		publish(t, l, b)
	}
	done.Store(true)
	readers.Wait()
	if dates, err := first.Dates(watcher.Returns); err != nil || len(dates) != 0 {
		t.Errorf("a reading of the empty ledger sees %v, %v", dates, err)
	}
}

func consistent(l *Ledger, cells int) error {
	v, err := l.Read()
	if err != nil {
		return err
	}
	defer v.Close()
	dst := make([]int64, cells)
	for date := range 3 {
		held, err := v.Fill(watcher.Returns, rules.Date(date), 0, 0, dst)
		if err != nil || held != (v.Step() > 0) {
			return errors.Join(errors.New("nothing is held"), err)
		}
		for _, x := range dst {
			if held && x != int64(v.Step()) {
				return errors.New("a cell is of another step")
			}
		}
	}
	return nil
}

// TestClose: a ledger with an open reading is not closed, and a closed reading says so.
func TestClose(t *testing.T) {
	l, err := Open(filepath.Join(t.TempDir(), "ledger.db"), Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	v := read(t, l)
	if err := l.Close(); err == nil {
		t.Error("closed under an open reading")
	}
	v.Close()
	if _, err := v.Names(); !errors.Is(err, errDone) {
		t.Error(err)
	}
	if err := v.Flags(true, nil); !errors.Is(err, errDone) {
		t.Error(err)
	}
	if err := l.Close(); err != nil {
		t.Error(err)
	}
}
