package ledger

import (
	"errors"
	"os"
	"testing"

	bolt "go.etcd.io/bbolt"
)

// TestUpgrade opens a ledger of schema 1 with programs that know more schemas, and then with one that knows fewer.
func TestUpgrade(t *testing.T) {
	path, _ := furnished(t)
	ran := 0
	up := func(*bolt.Tx) error { ran++; return nil }
	if _, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true, upgrades: []upgrade{up}}); err == nil || ran > 0 {
		t.Errorf("a reading upgraded the ledger: %v", err)
	}
	stop := errors.New("stop")
	fails := func(*bolt.Tx) error { return stop }
	if _, err := Open(path, Options{AnyFilesystem: true, upgrades: []upgrade{up, fails}}); !errors.Is(err, stop) {
		t.Error(err)
	}
	if _, err := verify(path); err != nil {
		t.Errorf("a failed upgrade changed the ledger: %v", err)
	}
	ran = 0
	for range 2 {
		l, err := Open(path, Options{AnyFilesystem: true, upgrades: []upgrade{up, up}})
		if err != nil || ran != 2 {
			t.Fatal(ran, err)
		}
		l.Close()
	}
	var newer *Newer
	if _, err := Open(path, Options{AnyFilesystem: true}); !errors.As(err, &newer) || newer.Schema != 3 || newer.Own != 1 {
		t.Error(err)
	}
	if _, err := verify(path + ".schema-1"); err != nil {
		t.Error(err)
	}
	if _, err := os.Stat(path + ".schema-3"); err == nil {
		t.Error("there is a copy of a ledger that needed no upgrade")
	}
}
