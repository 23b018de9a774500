package main

import (
	"context"
	"fmt"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/feed"
)

// namedFiles gives a pass the files that a person named, wherever they lie, in the place of those in a feed's folder.
type namedFiles struct{ files []string }

// Find looks at each file by itself, and puts them in the order of the dates in their names, then names.
func (n namedFiles) Find(f rules.Feed, now time.Time, _ bool) (all watcher.Found, err error) {
	for _, file := range n.files {
		path, err := filepath.Abs(file)
		if err != nil {
			return all, err
		}
		one := f
		one.Dir, one.Pattern, one.Sentinel = filepath.Dir(path), literal(filepath.Base(path)), ""
		found, err := feed.Find(one, now, true)
		if err != nil {
			return all, err
		}
		if len(found.Ready)+len(found.Refused) == 0 {
			return all, fmt.Errorf("no file %q", file)
		}
		all.Ready, all.Refused = append(all.Ready, found.Ready...), append(all.Refused, found.Refused...)
	}
	slices.SortStableFunc(all.Ready, func(a, b watcher.Candidate) int {
		if a.Date != b.Date {
			return int(a.Date) - int(b.Date)
		}
		return strings.Compare(a.Name, b.Name)
	})
	return all, nil
}

// Read is that of the feed room.
func (namedFiles) Read(ctx context.Context, c watcher.Candidate, f rules.Feed, names *watcher.Names, now time.Time,
	progress watcher.Progress) (*watcher.Sheet, error) {
	return source{}.Read(ctx, c, f, names, now, progress)
}

// literal is a pattern that only the name itself matches.
func literal(name string) string {
	return strings.NewReplacer(`\`, `\\`, `*`, `\*`, `?`, `\?`, `[`, `\[`).Replace(name)
}
