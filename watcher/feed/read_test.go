package feed

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// The clock of the tests.
var testNow = time.Date(2024, 6, 28, 18, 0, 0, 0, time.UTC)

// longFeed is the plainest feed: every setting at its default.
func longFeed() rules.Feed {
	return rules.Feed{Name: "admin", Layout: rules.Long, Columns: rules.Columns{Date: "date", Series: "series", Value: "return"},
		Value: rules.OfReturn, Unit: rules.Fraction, DateStyle: "YYYY-MM-DD", Decimal: '.', Separator: ',', Encoding: "utf-8",
		Missing: []string{"", "NA", "n/a"}}
}

func wideFeed() rules.Feed {
	f := longFeed()
	f.Layout = rules.Wide
	return f
}

// lay writes a file and gives its candidate.
func lay(t testing.TB, name string, content []byte) watcher.Candidate {
	t.Helper()
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, name), content, 0o600); err != nil {
		t.Fatal(err)
	}
	return candidate(t, dir, name)
}

func candidate(t testing.TB, dir, name string) watcher.Candidate {
	t.Helper()
	info, err := os.Stat(filepath.Join(dir, name))
	if err != nil {
		t.Fatal(err)
	}
	return watcher.Candidate{Feed: "admin", Dir: dir, Name: name, Size: info.Size(), ModTime: info.ModTime(), Date: nameDate(name)}
}

func read(t testing.TB, f rules.Feed, name, content string, o Options) (*watcher.Sheet, error) {
	t.Helper()
	if o.Now.IsZero() {
		o.Now = testNow
	}
	return Read(context.Background(), lay(t, name, []byte(content)), f, watcher.NewNames(nil, nil), o)
}

// spell writes a sheet as sorted lines of date, series, exact value and line.
func spell(s *watcher.Sheet) string {
	var b strings.Builder
	for _, c := range s.Columns {
		vals := make([]int64, c.Len())
		c.Fill(vals, 0, s.What.Places())
		for i, v := range vals {
			if v == watcher.Missing64 {
				continue
			}
			text := rules.Units(v).String()
			if s.What == watcher.Prices {
				text = rules.Price(v).String()
			}
			name := s.Names.Name(c.Block*watcher.BlockSize + uint32(i))
			b.WriteString(strings.Join([]string{c.Date.String(), string(name), text, itoa(c.Line(i))}, " ") + "\n")
		}
	}
	return b.String()
}

func itoa(n uint32) string { return rules.Price(int64(n) * 1e10).String() }

func TestReadPlain(t *testing.T) {
	s, err := read(t, longFeed(), "a.csv", "date,series,return\n2024-01-02,A,0.01\n2024-01-02,B,-0.0234\n2024-01-03,B,1e-3\n2024-01-03,A,NA\n", Options{})
	if err != nil {
		t.Fatal(err)
	}
	want := "2024-01-02 A 0.01 2\n2024-01-02 B -0.0234 3\n2024-01-03 B 0.001 4\n"
	if got := spell(s); got != want {
		t.Errorf("got\n%swant\n%s", got, want)
	}
}

func TestReadBad(t *testing.T) {
	_, err := read(t, longFeed(), "a.csv", "date,series,return\n2024-01-02,A,0.01\n2024-01-02,B,x\n", Options{})
	var bad *watcher.BadFile
	if !errors.As(err, &bad) || err.Error() != `a.csv:3:14: the value is not a number: "x"` {
		t.Error(err)
	}
}

func sum(text []byte) [32]byte { return sha256.Sum256(text) }

func hexOf(sum [32]byte) string { return hex.EncodeToString(sum[:]) }
