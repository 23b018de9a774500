//go:build unix

package feed

import (
	"errors"
	"net"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

func TestNameDate(t *testing.T) {
	for name, want := range map[string]string{
		"returns_2024-01-02.csv": "2024-01-02", "returns20240102.csv": "2024-01-02", "2024_01_02.csv": "2024-01-02", "2024.01.02.csv": "2024-01-02",
		"a-20240102T1730.csv": "2024-01-02", "a-202401021730.csv": "2024-01-02", "a-20240102173059.csv": "2024-01-02",
		"a-20241302-20240103.csv": "2024-01-03", "id20240102999.csv": "", "v3-2023-02-29.csv": "", "a-2024-0102.csv": "", "a.csv": "",
		"01022024.csv": "", "from-2024-01-02-to-2024-02-03.csv": "2024-01-02", "30240102.csv": "",
	} {
		if got := nameDate(name).String(); got != want {
			t.Errorf("%s: %q, want %q", name, got, want)
		}
	}
}

// inbox is a folder with files of an age.
type inbox struct {
	t   *testing.T
	dir string
}

func (b inbox) put(name string, age time.Duration) {
	b.t.Helper()
	path := filepath.Join(b.dir, name)
	if err := os.WriteFile(path, []byte("date,series,return\n"), 0o600); err != nil {
		b.t.Fatal(err)
	}
	if err := os.Chtimes(path, testNow.Add(-age), testNow.Add(-age)); err != nil {
		b.t.Fatal(err)
	}
}

// find spells what is found as ready | waiting | refused.
func (b inbox) find(f rules.Feed, settled bool) string {
	b.t.Helper()
	f.Dir = b.dir
	found, err := Find(f, testNow, settled)
	if err != nil {
		b.t.Fatal(err)
	}
	var lists [3][]string
	for _, c := range found.Ready {
		lists[0] = append(lists[0], c.Name)
	}
	for _, w := range found.Waiting {
		lists[1] = append(lists[1], w.Name+" "+w.Why)
	}
	for _, r := range found.Refused {
		lists[2] = append(lists[2], r.Error())
	}
	return strings.Join(lists[0], ",") + " | " + strings.Join(lists[1], ",") + " | " + strings.Join(lists[2], ",")
}

func TestFindOrderAndNames(t *testing.T) {
	b := inbox{t, t.TempDir()}
	for _, name := range []string{"b-20240103.csv", "a-20240104.csv", "z.csv", "c-20240103.csv", "a-20240102.csv.gz", ".hidden.csv", "x.csv.part",
		"x.csv.filepart", "x.csv.TMP", "x.csv.swp", "x.csv~", "x.txt", "[a].csv"} {
		b.put(name, time.Hour)
	}
	f := rules.Feed{Name: "admin", Pattern: "*.csv", Settle: time.Minute}
	if got, want := b.find(f, false), "[a].csv,z.csv,a-20240102.csv.gz,b-20240103.csv,c-20240103.csv,a-20240104.csv |  | "; got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	f.Pattern = "*"
	if got := b.find(f, false); strings.Contains(got, "part") || strings.Contains(got, "hidden") || strings.Contains(got, "~") || strings.Contains(got, "TMP") {
		t.Errorf("unfinished transfers were found: %s", got)
	}
	f.Pattern = "["
	f.Dir = b.dir
	if _, err := Find(f, testNow, false); err == nil {
		t.Error("a bad pattern was taken")
	}
	f.Dir = filepath.Join(b.dir, "none")
	if _, err := Find(f, testNow, false); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("no folder: %v", err)
	}
}

func TestFindSettle(t *testing.T) {
	b := inbox{t, t.TempDir()}
	f := rules.Feed{Name: "admin", Pattern: "*.csv", Settle: time.Minute}
	b.put("old.csv", time.Minute)
	b.put("young.csv", 59*time.Second)
	b.put("future.csv", -time.Hour)
	want := "old.csv | future.csv changed in the future, at 2024-06-28T19:00:00Z,young.csv changed 59s ago, settles after 1m0s | "
	if got := b.find(f, false); got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	if got, want := b.find(f, true), "future.csv,old.csv,young.csv |  | "; got != want {
		t.Errorf("settled: got  %s\nwant %s", got, want)
	}
	f.Sentinel = ".done"
	b.put("young.csv.done", 0)
	b.put("future.done", 0)
	f.Pattern = "*"
	if got, want := b.find(f, false), "future.csv,old.csv,young.csv |  | "; got != want {
		t.Errorf("sentinels: got  %s\nwant %s", got, want)
	}
}

func TestFindRefuses(t *testing.T) {
	b := inbox{t, t.TempDir()}
	other := filepath.Join(t.TempDir(), "secret.csv")
	b.put("real.csv", time.Hour)
	must := func(err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
	}
	must(os.WriteFile(other, []byte("date,series,return\n"), 0o600))
	must(os.Symlink(other, filepath.Join(b.dir, "out.csv")))
	must(os.Symlink("../"+filepath.Base(filepath.Dir(other))+"/secret.csv", filepath.Join(b.dir, "up.csv")))
	must(os.Symlink("real.csv", filepath.Join(b.dir, "within.csv")))
	must(os.Symlink("nothing.csv", filepath.Join(b.dir, "dangling.csv")))
	must(os.Mkdir(filepath.Join(b.dir, "folder.csv"), 0o700))
	must(syscall.Mkfifo(filepath.Join(b.dir, "pipe.csv"), 0o600))
	l, err := net.Listen("unix", filepath.Join(b.dir, "socket.csv"))
	must(err)
	defer l.Close()
	got := b.find(rules.Feed{Name: "admin", Pattern: "*.csv"}, false)
	want := "real.csv,within.csv |  | dangling.csv: is a link that leads nowhere,folder.csv: is a folder, not a file," +
		"out.csv: is a link out of the feed's folder; links are not followed there,pipe.csv: is a named pipe, not a file," +
		"socket.csv: is a device or socket, not a file,up.csv: is a link out of the feed's folder; links are not followed there"
	if got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	// A candidate that turned into one of these after it was found is not waited for either.
	for _, name := range []string{"pipe.csv", "out.csv", "folder.csv"} {
		var bad *watcher.BadFile
		c := watcher.Candidate{Feed: "admin", Dir: b.dir, Name: name}
		if _, err := Read(t.Context(), c, longFeed(), watcher.NewNames(nil, nil), Options{}); !errors.As(err, &bad) {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// The same refusal has the same key on every pass, another reason or time another.
func TestUnreadKey(t *testing.T) {
	c := watcher.Candidate{Feed: "f", Name: "a.csv", ModTime: testNow}
	later := c
	later.ModTime = testNow.Add(time.Second)
	a, b := unread(c, "is a folder, not a file"), unread(c, "is a folder, not a file")
	if a.File.SHA256 != b.File.SHA256 || a.File.SHA256 == unread(later, "is a folder, not a file").File.SHA256 ||
		a.File.SHA256 == unread(c, "is a named pipe, not a file").File.SHA256 {
		t.Error("keys of refusals do not tell them apart")
	}
}

func TestHashAndChange(t *testing.T) {
	c := lay(t, "a.csv", []byte("abc"))
	file, err := openFile(c)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	d := newDisk(t.Context(), file, c.Size, nil)
	err = d.rest(make([]byte, 2))
	// SHA-256 of "abc": FIPS 180-2, appendix B.1.
	if want := "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"; err != nil || hexOf(d.sum()) != want {
		t.Errorf("%s, %v", hexOf(d.sum()), err)
	}
	stale := c
	stale.Size = 2
	if err := unchanged(file, stale, 3); !errors.Is(err, watcher.ErrChanged) {
		t.Errorf("another size: %v", err)
	}
	stale = c
	stale.ModTime = c.ModTime.Add(time.Nanosecond)
	if _, err := Read(t.Context(), stale, longFeed(), watcher.NewNames(nil, nil), Options{}); !errors.Is(err, watcher.ErrChanged) {
		t.Errorf("another time: %v", err)
	}
}

// A file that is written to while it is read waits, even when what was read of it is bad.
func TestChangedWhileRead(t *testing.T) {
	for _, text := range []string{"date,series,return\n2024-01-02,A,1\n", "date,series,return\n2024-01-02,A,x\n"} {
		c := lay(t, "a.csv", []byte(text))
		once := false
		grow := func(int64, int64) {
			if once {
				return
			}
			once = true
			file, err := os.OpenFile(filepath.Join(c.Dir, c.Name), os.O_APPEND|os.O_WRONLY, 0)
			if err == nil {
				_, err = file.WriteString("2024-01-03,A,2\n")
				err = errors.Join(err, file.Close())
			}
			if err != nil {
				t.Error(err)
			}
		}
		names := watcher.NewNames(nil, nil)
		_, err := Read(t.Context(), c, longFeed(), names, Options{Now: testNow, Progress: grow})
		if !errors.Is(err, watcher.ErrChanged) || names.Len() != 0 {
			t.Errorf("%v, %d names", err, names.Len())
		}
	}
}
