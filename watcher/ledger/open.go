package ledger

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"runtime/debug"
	"strconv"
	"sync"
	"sync/atomic"
	"time"

	bolt "go.etcd.io/bbolt"
	bolterrors "go.etcd.io/bbolt/errors"

	"strayd/watcher"
)

// Mode is what a ledger is opened for.
type Mode uint8

const (
	ReadWrite Mode = iota
	ReadOnly
	Create // makes the file, then opens it for reading and writing; only for init and demo
)

// Options of Open; the zero value reads and writes.
type Options struct {
	Mode          Mode
	Timeout       time.Duration // to wait for the lock, default 1 s
	AnyFilesystem bool          // also a network or user-space file system
	Scratch       bool          // nothing of it is needed after a crash: commits do not wait for the disk

	upgrades []upgrade // in place of upgrades(), for tests
}

// Ledger is an open ledger: a watcher.Store, for any number of goroutines.
type Ledger struct {
	path     string
	db       *bolt.DB
	file     *os.File // bbolt's own, to let go of the lock when bbolt panics on opening
	identity identity

	mu         sync.Mutex                    // held by whoever writes
	arena      []byte                        // of encoded values, reused between commits
	broken     error                         // why writing is off: a panic left a transaction half done
	commitSize int                           // as the constant, smaller in tests
	readings   atomic.Int64                  // open ones
	names      atomic.Pointer[watcher.Names] // loaded last

	left bool // staged values of a failed batch are still there
}

// reserve is how much address space is set aside, so that a growing file is not mapped anew: a writer would have to wait for
// every open reading. Only addresses are used up.
const (
	reserve      = int64(16) << 30
	leastReserve = 64 << 20
)

// Open opens a ledger. Errors: ErrMissing, ErrEmpty, ErrHeld, ErrExists, ErrFilesystem (each wrapped with the path), *Foreign,
// *Newer, *Damaged.
func Open(path string, o Options) (*Ledger, error) {
	if o.upgrades == nil {
		o.upgrades = upgrades()
	}
	if !o.AnyFilesystem {
		if err := localDisk(filepath.Dir(path)); err != nil {
			return nil, err
		}
	}
	if o.Mode == Create {
		if err := create(path, &o); err != nil {
			return nil, err
		}
	}
	if o.Timeout == 0 {
		o.Timeout = time.Second
	}
	if err := precheck(path); err != nil {
		return nil, err
	}
	l, err := open(path, o)
	if err != nil {
		return nil, err
	}
	if err := l.begin(o); err != nil {
		return nil, errors.Join(err, l.Close())
	}
	return l, nil
}

// begin checks what was opened and, for writing, sweeps what was staged and never published.
func (l *Ledger) begin(o Options) error {
	if err := l.sameFile(); err != nil {
		return err
	}
	if err := l.checkOpened(); err != nil {
		return err
	}
	if err := l.identify(o.schema()); err != nil {
		return err
	}
	if err := l.bringUp(&o); err != nil {
		return err
	}
	if err := l.complete(); err != nil {
		return err
	}
	if o.Mode == ReadOnly {
		return nil
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.sweep()
}

// sameFile sees to it that the path was not given another file (restore, compact) while the lock was waited for.
func (l *Ledger) sameFile() error {
	held, err := l.file.Stat()
	if err != nil {
		return err
	}
	now, err := os.Stat(l.path)
	if err != nil || !os.SameFile(held, now) {
		return fmt.Errorf("ledger %s was replaced while it was opened: try again", l.path)
	}
	return nil
}

// open asks for less address space each time that it is refused (a limit of the process); the last time for no more than the
// file takes.
func open(path string, o Options) (*Ledger, error) {
	for room := addressRoom(path); ; room /= 4 {
		if room < leastReserve {
			room = 0
		}
		l, err := tryOpen(path, o, int(room))
		switch {
		case err == nil:
			return l, nil
		case errors.Is(err, bolterrors.ErrTimeout):
			return nil, refuse(path, ErrHeld)
		case room == 0 || isDamaged(err):
			return nil, err
		}
	}
}

func isDamaged(err error) bool {
	var d *Damaged
	return errors.As(err, &d)
}

// tryOpen opens the file with room bytes of address space.
func tryOpen(path string, o Options, room int) (l *Ledger, err error) {
	l = &Ledger{path: path, commitSize: commitSize}
	defer func() {
		if err != nil && l.file != nil {
			_ = letGo(l.file) // fails when bbolt itself has closed it
		}
	}()
	defer guard(path, debug.SetPanicOnFault(true), &err)
	l.db, err = bolt.Open(path, 0o600, &bolt.Options{
		Timeout:         o.Timeout,
		ReadOnly:        o.Mode == ReadOnly,
		NoSync:          o.Scratch,
		FreelistType:    bolt.FreelistMapType,
		PreLoadFreelist: true,
		NoStatistics:    true,
		InitialMmapSize: room,
		OpenFile:        l.openFile,
	})
	if errors.Is(err, bolterrors.ErrInvalid) || errors.Is(err, bolterrors.ErrChecksum) || errors.Is(err, bolterrors.ErrVersionMismatch) {
		err = &Damaged{Path: path, Why: err.Error()}
	}
	return l, err
}

// openFile never creates a file, whatever bbolt asks for.
func (l *Ledger) openFile(name string, flag int, mode os.FileMode) (*os.File, error) {
	f, err := os.OpenFile(name, flag&^os.O_CREATE, mode)
	l.file = f
	return f, err
}

// addressRoom is the address space to ask for first.
func addressRoom(path string) int64 {
	room := reserve
	if strconv.IntSize == 32 {
		room /= 64
	}
	if info, err := os.Stat(path); err == nil {
		room = max(room, 4*info.Size())
	}
	return min(room, math.MaxInt)
}

// identify checks that the file is a ledger, and not of a later schema than own.
func (l *Ledger) identify(own uint32) (err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	return l.db.View(func(tx *bolt.Tx) error {
		meta := tx.Bucket(inMeta.name())
		if meta == nil {
			return nameless(l.path, tx, "the bucket is not there")
		}
		if l.identity, err = readIdentity(l.path, meta); err != nil {
			return err
		}
		if l.identity.schema > own {
			return &Newer{l.path, l.identity.schema, own}
		}
		return nil
	})
}

// complete checks that every bucket and the head are there.
func (l *Ledger) complete() (err error) {
	defer guard(l.path, debug.SetPanicOnFault(true), &err)
	return l.db.View(func(tx *bolt.Tx) error {
		for b := range buckets {
			if tx.Bucket(b.name()) == nil {
				return &Damaged{Where: b.String(), Why: "the bucket is not there"}
			}
		}
		_, err := readHead(tx.Bucket(inMeta.name()))
		return err
	})
}

// nameless is the error for a file that does not say what it is: damaged when other buckets are a ledger's, foreign when none is.
func nameless(path string, tx *bolt.Tx, why string) error {
	for b := range buckets {
		if b != inMeta && tx.Bucket(b.name()) != nil {
			return &Damaged{Path: path, Where: inMeta.String(), Why: why}
		}
	}
	return &Foreign{path, "it is a database of another program"}
}

func readIdentity(path string, meta *bolt.Bucket) (identity, error) {
	v := meta.Get([]byte(keyIdentity))
	if v == nil {
		return identity{}, nameless(path, meta.Tx(), "it does not say that this is a ledger")
	}
	body, err := opened(inMeta, []byte(keyIdentity), v)
	if err != nil {
		return identity{}, err
	}
	i, ok := unpackIdentity(body)
	if !ok {
		return i, malformed(inMeta, []byte(keyIdentity), "it does not say that this is a ledger")
	}
	return i, nil
}

func readHead(meta *bolt.Bucket) (head, error) {
	body, err := metaRow(meta, keyHead)
	if err != nil {
		return head{}, err
	}
	h, ok := unpackHead(body)
	if !ok {
		return h, malformed(inMeta, []byte(keyHead), "it cannot be read")
	}
	return h, nil
}

func metaRow(meta *bolt.Bucket, key string) ([]byte, error) {
	v := meta.Get([]byte(key))
	if v == nil {
		return nil, malformed(inMeta, []byte(key), "it is not there")
	}
	return opened(inMeta, []byte(key), v)
}

// Path is the name under which the ledger was opened.
func (l *Ledger) Path() string { return l.path }

// Close closes the file and lets go of the lock. It refuses while a reading is open: bbolt would wait for it for ever.
func (l *Ledger) Close() (err error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	if n := l.readings.Load(); n > 0 {
		return fmt.Errorf("ledger %s cannot be closed: %d readings are open", l.path, n)
	}
	if l.broken != nil {
		return letGo(l.file) // bbolt's own locks may still be held
	}
	return l.db.Close()
}
