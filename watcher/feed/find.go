package feed

import (
	"cmp"
	"crypto/sha256"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// Find lists the files of a feed. A file is ready when it is older than the feed's settle, when its sentinel is there (the file's
// name with the sentinel added, or put in place of the extension), or when settled says so. Files whose names begin with a dot
// or end in a suffix of unfinished transfers are not there at all. A pattern also matches names with .gz added.
func Find(f rules.Feed, now time.Time, settled bool) (watcher.Found, error) {
	var found watcher.Found
	root, err := os.OpenRoot(f.Dir)
	if err != nil {
		return found, err
	}
	defer root.Close()
	names, err := namesIn(root)
	if err != nil {
		return found, err
	}
	for _, name := range names {
		ok, err := matches(f, name)
		if err != nil {
			return found, fmt.Errorf("files %q: %w", f.Pattern, err)
		}
		if !ok {
			continue
		}
		c := watcher.Candidate{Feed: f.Name, Dir: f.Dir, Name: name, Date: nameDate(name), Sentinel: hasSentinel(names, name, f.Sentinel)}
		if err := sortInto(&found, root, c, f.Settle, now, settled); err != nil {
			return found, err
		}
	}
	arrange(&found)
	return found, nil
}

func namesIn(root *os.Root) ([]string, error) {
	dir, err := root.Open(".")
	if err != nil {
		return nil, err
	}
	defer dir.Close()
	return dir.Readdirnames(-1)
}

// sortInto puts a candidate where it belongs.
func sortInto(found *watcher.Found, root *os.Root, c watcher.Candidate, settle time.Duration, now time.Time, settled bool) error {
	info, err := root.Stat(c.Name)
	if gone(root, c.Name, err) {
		return nil
	}
	if reason := unfit(info, err); reason != "" {
		found.Refused = append(found.Refused, unread(c, reason))
		return nil
	}
	if err != nil {
		return err
	}
	c.Size, c.ModTime, c.Stamp = info.Size(), info.ModTime(), stamp(info)
	if why := waits(c, settle, now); why != "" && !settled {
		found.Waiting = append(found.Waiting, watcher.Waiting{Candidate: c, Why: why})
		return nil
	}
	found.Ready = append(found.Ready, c)
	return nil
}

// gone says whether a name was taken away after it was listed, as against a link that leads nowhere.
func gone(root *os.Root, name string, err error) bool {
	if !errors.Is(err, fs.ErrNotExist) {
		return false
	}
	_, err = root.Lstat(name)
	return errors.Is(err, fs.ErrNotExist)
}

// unfit says why something must not be opened, nothing when it may. os.Root does not follow a link out of the folder.
func unfit(info fs.FileInfo, err error) string {
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return "is a link that leads nowhere"
	case errors.Is(err, fs.ErrPermission):
		return ""
	case err != nil && strings.Contains(err.Error(), "escapes"):
		return "is a link out of the feed's folder; links are not followed there"
	case err != nil:
		return ""
	case info.IsDir():
		return "is a folder, not a file"
	case info.Mode()&fs.ModeNamedPipe != 0:
		return "is a named pipe, not a file"
	case !info.Mode().IsRegular():
		return "is a device or socket, not a file"
	}
	return ""
}

// unread is the refusal of a file that was not read. In place of the hash of its bytes it has one of its name, size, time and the reason,
// so that the same refusal is known again.
func unread(c watcher.Candidate, reason string) *watcher.BadFile {
	key := fmt.Sprintf("not read\x00%s\x00%d\x00%s\x00%s", c.Name, c.Size, c.ModTime.UTC().Format(time.RFC3339Nano), reason)
	file := watcher.File{Feed: c.Feed, Name: c.Name, Size: c.Size, SHA256: sha256.Sum256([]byte(key))}
	return &watcher.BadFile{File: file, Date: c.Date, Reason: reason}
}

func waits(c watcher.Candidate, settle time.Duration, now time.Time) string {
	age := now.Sub(c.ModTime)
	switch {
	case c.Sentinel || age >= settle:
		return ""
	case age < 0:
		return "changed in the future, at " + c.ModTime.Format(time.RFC3339)
	}
	return fmt.Sprintf("changed %s ago, settles after %s", age.Round(time.Second), settle)
}

var unfinished = []string{".part", ".filepart", ".tmp", ".swp", "~"}

func matches(f rules.Feed, name string) (bool, error) {
	ok, err := path.Match(f.Pattern, name)
	if plain, packed := strings.CutSuffix(name, gzipSuffix); !ok && packed && err == nil {
		ok, err = path.Match(f.Pattern, plain)
	}
	if !ok || err != nil || name[0] == '.' || f.Sentinel != "" && strings.HasSuffix(name, f.Sentinel) {
		return false, err
	}
	lower := strings.ToLower(name)
	return !slices.ContainsFunc(unfinished, func(s string) bool { return strings.HasSuffix(lower, s) }), nil
}

func hasSentinel(names []string, name, sentinel string) bool {
	if sentinel == "" {
		return false
	}
	stem := strings.TrimSuffix(name, gzipSuffix)
	stem = strings.TrimSuffix(stem, path.Ext(stem))
	return slices.Contains(names, name+sentinel) || slices.Contains(names, stem+sentinel)
}

func arrange(found *watcher.Found) {
	byDate := func(a, b watcher.Candidate) int {
		return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Name, b.Name))
	}
	slices.SortFunc(found.Ready, byDate)
	slices.SortFunc(found.Waiting, func(a, b watcher.Waiting) int { return byDate(a.Candidate, b.Candidate) })
	slices.SortFunc(found.Refused, func(a, b *watcher.BadFile) int {
		return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.File.Name, b.File.Name))
	})
}

// dateInName finds a year, month and day, joined or with one sort of separator, perhaps with a time of day after them.
var dateInName = regexp.MustCompile(`(?:^|[^0-9])((?:19|20)[0-9]{2})([-_.]?)([0-9]{2})([-_.]?)([0-9]{2})(?:[0-9]{4}|[0-9]{6})?(?:[^0-9]|$)`)

// nameDate is the first date in a file's name, NoDate when there is none.
func nameDate(name string) rules.Date {
	for from := 0; ; {
		at := dateInName.FindStringSubmatchIndex(name[from:])
		if at == nil {
			return rules.NoDate
		}
		part := func(i int) string { return name[from+at[2*i] : from+at[2*i+1]] }
		year, _ := strconv.Atoi(part(1))
		month, _ := strconv.Atoi(part(3))
		day, _ := strconv.Atoi(part(5))
		if d, ok := rules.DateOf(year, month, day); ok && part(2) == part(4) {
			return d
		}
		from += at[3] // after the year
	}
}
