package ledger

import (
	"context"
	"errors"
	"math/rand/v2"
	"path/filepath"
	"reflect"
	"testing"

	bolt "go.etcd.io/bbolt"

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
