package ledger

import (
	"bytes"
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	bolt "go.etcd.io/bbolt"

	"strayd/rules"
	"strayd/watcher"
)

// furnished makes a closed ledger that has something in every bucket, several layers among it, and gives its path and the
// heads of the record after each step.
func furnished(t testing.TB) (path string, heads []string) {
	t.Helper()
	return furnishedSteps(t, 5)
}

func furnishedSteps(t testing.TB, steps uint32) (path string, heads []string) {
	t.Helper()
	path = filepath.Join(t.TempDir(), "ledger.db")
	l, err := Open(path, Options{Mode: Create, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	rng := rand.New(rand.NewPCG(3, 4))
	ref := uint64(1)
	for step := uint32(1); step <= steps; step++ {
		publish(t, l, furnish(rng, step, &ref))
		if err := l.EndPass(watcher.PassRow{Started: noon, Ended: noon, Program: "v1", Accepted: 1}); err != nil {
			t.Fatal(err)
		}
		if err := l.Done("job", noon.Add(time.Duration(step)*time.Hour)); err != nil {
			t.Fatal(err)
		}
		v, err := l.Read()
		if err != nil {
			t.Fatal(err)
		}
		head, _ := v.Head()
		heads = append(heads, head)
		v.Close()
	}
	for b := range buckets {
		_ = l.db.View(func(tx *bolt.Tx) error {
			if k, _ := tx.Bucket(b.name()).Cursor().First(); k == nil {
				t.Fatalf("bucket %s is empty", b)
			}
			return nil
		})
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	return path, heads
}

func furnish(rng *rand.Rand, step uint32, ref *uint64) *watcher.Batch {
	const series = 60
	b := &watcher.Batch{Step: step, File: fileRow(step), Settings: []byte(strings.Repeat("text ", int(step))),
		Notices:   []rules.Notice{notice("desk", fmt.Sprint("a", step)), notice("console", fmt.Sprint("b", step))},
		NewRanges: []watcher.RangeKey{{ID: uint16(step), Key: "range"}},
		NewNames:  names(int(step-1)*series, series), Record: []watcher.RecordEntry{{Kind: "settings", Who: "ada", At: noon, Body: []byte("{}")}}}
	for date := rules.Date(step); date < rules.Date(step)+12; date++ {
		for _, list := range []*[]*watcher.Column{&b.Returns, &b.Prices} {
			c := &watcher.Column{Date: date, Decimals: 8, Lines: watcher.Lines{First: 2, Stride: 1}}
			for range min(series*step, watcher.BlockSize) {
				c.V32 = append(c.V32, rng.Int32N(1e6))
			}
			*list = append(*list, c)
		}
		b.Used = append(b.Used, watcher.UsedColumn{Range: 1, Date: date, Offsets: []uint16{3, 9}, Values: []int64{5, watcher.Missing64}})
		b.Scales = append(b.Scales, watcher.GroupScale{Range: 1, Group: "g", Date: date, Step: step, Deviation: 0.5, Series: 9})
		b.Flags = append(b.Flags, &watcher.FlagRow{New: true, SeriesID: uint32(date), Flag: rules.Flag{Ref: *ref, Step: step, RaisedAt: noon, Date: date,
			Kind: rules.KindBreach, Return: 1, Range: "own", Standing: []rules.Standing{rules.Open, rules.Reopened, rules.OfHistory}[*ref%3], Feed: "admin", File: "x.csv"}})
		*ref++
	}
	if step > 1 {
		decide(b, rules.Flag{Ref: 1, Step: 1, Date: 1, Kind: rules.KindBreach})
	}
	s := watcher.State{Range: 1, Step: step, Upto: 5}
	for i := range series {
		s.N, s.Last = append(s.N, uint32(i)), append(s.Last, 4)
		s.Sum, s.Sq = append(s.Sum, watcher.Int128{Lo: rng.Uint64()}), append(s.Sq, watcher.Int128{Lo: rng.Uint64()})
	}
	b.States = []watcher.State{s}
	return b
}

// decide puts into a batch what somebody decided of a flag.
func decide(b *watcher.Batch, f rules.Flag) {
	e := rules.Entry{Refs: []uint64{f.Ref}, Act: rules.Act{Deed: rules.Decide, Step: b.Step, By: rules.Person{UID: 1001, Name: "ada"}, At: noon,
		Conclusion: rules.Corrected, Value: 12, Reason: rules.DataError, Note: "as printed", Until: rules.NoDate}}
	f.Standing, f.Last, f.Decided = rules.Decided, &e.Act, &e.Act
	b.Flags = append(b.Flags, &watcher.FlagRow{Flag: f})
	b.Record = append(b.Record, watcher.RecordEntry{Kind: watcher.DecisionEntry, Who: e.By.String(), At: e.At, Body: e.Text()})
}

func verify(path string) (Report, error) {
	l, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		return Report{}, err
	}
	defer l.Close()
	return l.Verify(context.Background(), VerifyOptions{})
}

// bytesOfValues lists where in the file the bytes of live keys and values lie.
func bytesOfValues(t testing.TB, path string) (at []int64) {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	err = checkPages(f, func(page int64, _ []byte, e leafElement) {
		for i := e.key; i < e.end; i++ {
			at = append(at, page+int64(i))
		}
	})
	if err != nil {
		t.Fatal(err)
	}
	return at
}

// flip turns one bit of a file over.
func flip(t testing.TB, f *os.File, at int64, bit uint) {
	t.Helper()
	var b [1]byte
	if _, err := f.ReadAt(b[:], at); err != nil {
		t.Fatal(err)
	}
	b[0] ^= 1 << bit
	if _, err := f.WriteAt(b[:], at); err != nil {
		t.Fatal(err)
	}
}

// TestEveryBitCounts flips bits of live keys and values in a ledger file, one after another: each must be found.
func TestEveryBitCounts(t *testing.T) {
	path, _ := furnished(t)
	if r, err := verify(path); err != nil || r.Staged != 0 || r.Values < 200 {
		t.Fatalf("before any damage: %+v, %v", r, err)
	}
	live := bytesOfValues(t, path)
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	seed := rand.Uint64()
	rng := rand.New(rand.NewPCG(seed, 5))
	t.Logf("%d live bytes, seed %d", len(live), seed)
	for range trials(1500) {
		at, bit := live[rng.IntN(len(live))], uint(rng.IntN(8))
		flip(t, f, at, bit)
		if _, err := verify(path); !isDamaged(err) {
			t.Errorf("bit %d of byte %d: %v", bit, at, err)
		}
		flip(t, f, at, bit)
	}
	if _, err := verify(path); err != nil {
		t.Error(err)
	}
}

// TestNamelessIsDamaged flips every bit of the words that say what the file is: it is damaged then, never another program's.
func TestNamelessIsDamaged(t *testing.T) {
	path, _ := furnished(t)
	whole, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	for _, word := range []string{string(inMeta.name()), keyIdentity} {
		damaged := 0
		for at := range whole {
			if !bytes.HasPrefix(whole[at:], []byte(word)) {
				continue
			}
			for bit := range 8 * len(word) {
				flip(t, f, int64(at+bit/8), uint(bit%8))
				_, err := verify(path)
				if isDamaged(err) {
					damaged++
				} else if err != nil { // no error: the page is an idle one
					t.Errorf("bit %d of %q: %v", bit, word, err)
				}
				flip(t, f, int64(at+bit/8), uint(bit%8))
			}
		}
		if damaged == 0 {
			t.Errorf("%q is nowhere in the file", word)
		}
	}
}

func trials(n int) int {
	if testing.Short() {
		return n / 10
	}
	return n
}

// content is a digest of every key and value, "" when they cannot all be read.
func content(path string) (sum string, err error) {
	l, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		return "", err
	}
	defer l.Close()
	h := sha256.New()
	err = l.db.View(func(tx *bolt.Tx) error {
		for b := range buckets {
			if err := tx.Bucket(b.name()).ForEach(func(k, v []byte) error {
				h.Write(k)
				h.Write(v)
				return nil
			}); err != nil {
				return err
			}
		}
		return nil
	})
	return string(h.Sum(nil)), err
}

// TestDamagedPages flips bits anywhere in the file, heads of pages and the list of free pages included: verify finds it, or
// nothing that is held has changed. Some bits mean nothing: idle pages, slack, unused flags.
func TestDamagedPages(t *testing.T) {
	path, _ := furnished(t)
	whole, err := content(path)
	if err != nil {
		t.Fatal(err)
	}
	f, err := os.OpenFile(path, os.O_RDWR, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	info, _ := f.Stat()
	seed := rand.Uint64()
	rng := rand.New(rand.NewPCG(seed, 6))
	t.Logf("seed %d", seed)
	found := 0
	for range trials(1500) {
		at := rng.Int64N(info.Size())
		if rng.IntN(2) == 0 {
			at = at/4096*4096 + rng.Int64N(200) // where the structure is
		}
		bit := uint(rng.IntN(8))
		flip(t, f, at, bit)
		if _, err := verify(path); err == nil {
			if now, err := content(path); err != nil || now != whole {
				t.Errorf("bit %d of byte %d: not found, and the content differs (%v)", bit, at, err)
			}
		} else {
			found++
		}
		flip(t, f, at, bit)
	}
	t.Logf("found %d", found)
	if found == 0 {
		t.Error("no damage was found at all")
	}
}

// useAll calls every method of a reading and returns the first error.
func useAll(l *Ledger) error {
	v, err := l.Read()
	if err != nil {
		return err
	}
	defer v.Close()
	dst := make([]int64, 300)
	var errs []error
	note := func(err error) { errs = append(errs, err) }
	for _, w := range []watcher.What{watcher.Returns, watcher.Prices} {
		dates, err := v.Dates(w)
		note(err)
		for _, d := range dates {
			_, err := v.Fill(w, d, 0, 0, dst)
			note(err)
			note(v.Patch(1, d, 0, 0, dst))
			_, err = v.Marked(d, 0)
			note(err)
			_, _, err = v.FlagAt(uint32(d), d, rules.KindBreach)
			note(err)
		}
		_, err = v.Series(w, 7)
		note(err)
		note(v.Values(w, func(rules.Date, uint32, int64) error { return nil }))
	}
	_, err = v.Names()
	note(err)
	_, err = v.Used(1, 3)
	note(err)
	_, err = v.State(1, 0)
	note(err)
	_, _, err = v.FileSeen("admin", [32]byte{1, 2, 3}, "key")
	note(err)
	_, err = v.Ranges()
	note(err)
	_, err = v.GroupScales(1, "g")
	note(err)
	_, err = v.Settings(1)
	note(err)
	_, _, err = v.LastPass()
	note(err)
	note(v.Files(func(watcher.FileRow) bool { return true }))
	note(v.Passes(func(watcher.PassRow) bool { return true }))
	note(v.Record(func(Entry) bool { return true }))
	note(v.Flags(true, func(rules.Flag) bool { return true }))
	note(v.Flags(false, func(rules.Flag) bool { return true }))
	return errors.Join(errs...)
}

// TestNoPanicComesOut damages a ledger roughly (zeroed pages, a file cut short while it is open) and uses every method of a
// reading, on another goroutine: only errors come out, and they say that the ledger is damaged.
func TestNoPanicComesOut(t *testing.T) {
	path, _ := furnished(t)
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	use := func(l *Ledger) error {
		done := make(chan error)
		go func() { done <- useAll(l) }()
		return <-done
	}
	bad := 0
	for page := 2; page < len(data)/4096; page++ {
		hurt := append([]byte(nil), data...)
		clear(hurt[page*4096:][:4096])
		other := filepath.Join(t.TempDir(), "hurt.db")
		if err := os.WriteFile(other, hurt, 0o600); err != nil {
			t.Fatal(err)
		}
		l, err := Open(other, Options{AnyFilesystem: true})
		if err == nil {
			ref := uint64(61)
			err = errors.Join(use(l), l.Publish(furnish(rand.New(rand.NewPCG(1, 1)), 6, &ref)))
			if err := l.Close(); err != nil {
				t.Error(err)
			}
		}
		if again, err := Open(other, Options{AnyFilesystem: true}); err == nil {
			again.Close()
		} else if errors.Is(err, ErrHeld) {
			t.Errorf("page %d zeroed: the lock is still held", page)
		}
		if err != nil && !isDamaged(err) && !errors.Is(err, ErrNone) {
			t.Errorf("page %d zeroed: %v", page, err)
		}
		if err != nil {
			bad++
		}
	}
	if bad == 0 {
		t.Error("no zeroed page was noticed")
	}
	l, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if err := os.Truncate(path, 8192); err != nil {
		t.Fatal(err)
	}
	if err := use(l); !isDamaged(err) {
		t.Errorf("cut short while open: %v", err)
	}
	if _, err := Open(path, Options{AnyFilesystem: true}); !isDamaged(err) || !strings.Contains(err.Error(), "cut short") {
		t.Errorf("cut short: %v", err)
	}
}

func TestVerifyHead(t *testing.T) {
	path, heads := furnished(t)
	l, err := Open(path, Options{Mode: ReadOnly, AnyFilesystem: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	for i, head := range heads {
		r, err := l.Verify(context.Background(), VerifyOptions{Head: head})
		if err != nil || r.HeadSeen != uint64(2*i+1) || r.Head != heads[len(heads)-1] {
			t.Errorf("head %d: %+v, %v", i+1, r, err)
		}
	}
	if _, err := l.Verify(context.Background(), VerifyOptions{Head: strings.Repeat("ab", 32)}); !isDamaged(err) {
		t.Error(err)
	}
	if _, err := l.Verify(context.Background(), VerifyOptions{Head: "ab"}); err == nil || isDamaged(err) {
		t.Error(err)
	}
	want := errors.New("differs")
	if _, err := l.Verify(context.Background(), VerifyOptions{Recheck: func(watcher.View) error { return want }}); !errors.Is(err, want) {
		t.Error(err)
	}
}

// TestVerifyFindsWhatIsSealed changes content and seals it again, as somebody would who knows how: the totals, the chain or the
// indexes must tell.
func TestVerifyFindsWhatIsSealed(t *testing.T) {
	for _, c := range []struct {
		what   string
		change func(b func(bucket) *bolt.Bucket) error
	}{
		{"a column removed", func(b func(bucket) *bolt.Bucket) error {
			k, _ := b(inReturns).Cursor().First()
			return b(inReturns).Delete(k)
		}},
		{"an entry of the record rewritten", func(b func(bucket) *bolt.Bucket) error {
			key := put64(nil, 2)
			e := Entry{Number: 2, RecordEntry: watcher.RecordEntry{Kind: "decision", Who: "eve", At: noon}}
			e.Hash = e.link()
			v := packEntry(make([]byte, sealSize), &e)
			seal(inRecord, key, v)
			return b(inRecord).Put(key, v)
		}},
		{"an open flag closed in the index only", func(b func(bucket) *bolt.Bucket) error {
			k, _ := b(inOpen).Cursor().First()
			return b(inOpen).Delete(k)
		}},
		{"a value of a step that is not published", func(b func(bucket) *bolt.Bucket) error {
			key := put32(nil, 99)
			v := packFile(make([]byte, sealSize), &watcher.FileRow{Outcome: watcher.Accepted})
			seal(inFiles, key, v)
			return b(inFiles).Put(key, v)
		}},
	} {
		path, _ := furnished(t)
		l, err := Open(path, Options{AnyFilesystem: true})
		if err != nil {
			t.Fatal(err)
		}
		err = l.db.Update(func(tx *bolt.Tx) error {
			return c.change(func(b bucket) *bolt.Bucket { return tx.Bucket(b.name()) })
		})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := l.Verify(context.Background(), VerifyOptions{}); !isDamaged(err) {
			t.Errorf("%s: %v", c.what, err)
		}
		l.Close()
	}
}
