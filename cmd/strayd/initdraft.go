package main

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"time"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/sample"
)

// sampleFile is one file that a configuration is written from.
type sampleFile struct {
	*sample.Sample
	dir, name string // absolute folder, base name
	arrived   time.Time
	rows      int // as they were read by the draft
}

// draft is a feed in the making.
type draft struct {
	name     string
	dir      string // absolute
	pattern  string
	files    []*sampleFile
	finding  *sample.Finding
	schedule string
	others   int // files that the pattern takes in, beside the samples
}

// draftFeeds looks at every file and makes a feed of those that belong together.
func (a *app) draftFeeds(files []string, now time.Time) ([]*draft, error) {
	var samples []*sampleFile
	var faults []error
	for _, file := range files {
		s, err := a.lookInto(file)
		if err != nil {
			faults = append(faults, err)
			continue
		}
		if !slices.ContainsFunc(samples, func(o *sampleFile) bool { return o.dir == s.dir && o.name == s.name }) {
			samples = append(samples, s)
		}
	}
	if len(faults) > 0 {
		return nil, errors.Join(faults...)
	}
	drafts, err := together(samples)
	if err != nil {
		return nil, err
	}
	for _, d := range drafts {
		of := make([]*sample.Sample, len(d.files))
		for i, s := range d.files {
			of[i] = s.Sample
		}
		if d.finding, err = sample.Look(of, rules.DateFrom(now)); err != nil {
			return nil, err
		}
		d.schedule = arrivals(d.files)
	}
	nameDrafts(drafts)
	return drafts, nil
}

// lookInto reads the beginning of a sample.
func (a *app) lookInto(file string) (*sampleFile, error) {
	full, err := filepath.Abs(a.path(file))
	if err != nil {
		return nil, err
	}
	info, err := os.Stat(full)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil, fmt.Errorf("%s: there is no such file", file)
	case err != nil:
		return nil, err
	case !info.Mode().IsRegular():
		return nil, fmt.Errorf("%s: is not a file; name the files in it, such as %s/*.csv", file, strings.TrimSuffix(file, "/"))
	}
	f, err := os.Open(full)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	var s *sample.Sample
	if open := grids()[strings.ToLower(filepath.Ext(full))]; open != nil {
		s, err = gridSample(filepath.Base(full), f, info.Size(), open)
	} else {
		s, err = sample.Text(filepath.Base(full), f)
	}
	if err != nil {
		return nil, err
	}
	return &sampleFile{Sample: s, dir: filepath.Dir(full), name: filepath.Base(full), arrived: info.ModTime().UTC()}, nil
}

// together makes a feed of the samples of one folder that have the same header. Where its pattern would take in samples of another
// feed, it is parted by the names.
func together(samples []*sampleFile) ([]*draft, error) {
	drafts := gathered(samples, func(s *sampleFile) string {
		return strings.Join(append([]string{s.dir, path.Ext(plainName(s.name)), s.Encoding, string(s.Separator)}, s.Header...), "\x00")
	})
	var parted []*draft
	for _, d := range drafts {
		if d.takesIn(drafts) == nil {
			parted = append(parted, d)
			continue
		}
		parted = append(parted, gathered(d.files, func(s *sampleFile) string { return stem(s.name) })...)
	}
	for _, d := range parted {
		if s := d.takesIn(parted); s != nil {
			return nil, fmt.Errorf("%s and %s lie in one folder under like names, but their headers differ: %s and %s; give the feeds folders or names of their own",
				d.files[0].name, s.name, printable(strings.Join(d.files[0].Header, ",")), printable(strings.Join(s.Header, ",")))
		}
	}
	return parted, nil
}

func gathered(samples []*sampleFile, key func(*sampleFile) string) (drafts []*draft) {
	at := map[string]*draft{}
	for _, s := range samples {
		d := at[key(s)]
		if d == nil {
			d = &draft{dir: s.dir}
			at[key(s)], drafts = d, append(drafts, d)
		}
		d.files = append(d.files, s)
	}
	for _, d := range drafts {
		slices.SortFunc(d.files, func(a, b *sampleFile) int { return cmp.Compare(a.name, b.name) })
		d.pattern = stem(d.files[0].name)
		for _, s := range d.files[1:] {
			if stem(s.name) != d.pattern {
				d.pattern = "*" + path.Ext(plainName(s.name))
				break
			}
		}
	}
	return drafts
}

// takesIn gives a sample of another feed that this one's pattern takes in too, nil when there is none.
func (d *draft) takesIn(all []*draft) *sampleFile {
	for _, o := range all {
		for _, s := range o.files {
			if ok, err := path.Match(d.pattern, plainName(s.name)); o != d && o.dir == d.dir && (ok || err != nil) {
				return s
			}
		}
	}
	return nil
}

// plainName is the name of a file without .gz.
func plainName(name string) string { return strings.TrimSuffix(name, ".gz") }

var (
	numbersInName = regexp.MustCompile(`[0-9]+([-_.][0-9]+)*`)
	marksInName   = regexp.MustCompile(`[*?\[\]\\]`)
)

// stem is a file's name with a star in place of its date or number.
func stem(name string) string {
	name = plainName(name)
	ext := path.Ext(name)
	base := marksInName.ReplaceAllString(strings.TrimSuffix(name, ext), "?")
	return numbersInName.ReplaceAllString(base, "*") + ext
}

var notInName = regexp.MustCompile(`[^\p{L}\p{N} _-]+`)

// nameDrafts calls each feed after its folder, or after its files where the folder says nothing.
func nameDrafts(drafts []*draft) {
	taken := map[string]int{}
	for _, d := range drafts {
		name := filepath.Base(d.dir)
		alone := !slices.ContainsFunc(drafts, func(o *draft) bool { return o != d && o.dir == d.dir })
		if s := strings.Trim(notInName.ReplaceAllString(strings.TrimSuffix(d.pattern, path.Ext(d.pattern)), ""), "-_ "); s != "" &&
			(!alone || slices.Contains([]string{"inbox", "incoming", "in", "data", "files", "samples"}, strings.ToLower(name))) {
			name = s
		}
		name = strings.Trim(notInName.ReplaceAllString(name, "-"), "-_ ")
		if runes := []rune(name); len(runes) > 40 {
			name = string(runes[:40])
		}
		name = cmp.Or(name, "feed")
		if taken[name]++; taken[name] > 1 {
			name = fmt.Sprintf("%s-%d", name, taken[name])
		}
		d.name = name
	}
}

// arrivals guesses a schedule from the times at which files came: on three days or more, within three hours of the day. "" for no guess.
func arrivals(files []*sampleFile) string {
	days := map[string]bool{}
	first, last := 24, 0
	week := map[time.Weekday]bool{}
	for _, f := range files {
		days[f.arrived.Format(time.DateOnly)] = true
		first, last = min(first, f.arrived.Hour()), max(last, f.arrived.Hour())
		week[f.arrived.Weekday()] = true
	}
	if len(days) < 3 || last-first > 3 {
		return ""
	}
	on := "*"
	if !week[time.Sunday] && !week[time.Saturday] {
		on = "mon-fri"
	} else if !week[time.Sunday] && !week[time.Monday] {
		on = "tue-sat"
	}
	return fmt.Sprintf("*/10 %d-%d * * %s", first, min(last+2, 23), on)
}

// tryDrafts reads the samples by the configuration that was written, as a pass would.
func (a *app) tryDrafts(drafts []*draft, text string, now time.Time) error {
	c, err := config.Parse(a.configPath, []byte(text), configOptions())
	if err != nil {
		return fmt.Errorf("no configuration could be written from these samples: %w", err)
	}
	names := watcher.NewNames(nil, nil)
	for i, f := range c.Feeds {
		found, err := source{}.Find(f, now, true)
		if err != nil {
			return err
		}
		if err := a.tryDraft(drafts[i], f, found, names, now); err != nil {
			return err
		}
	}
	return nil
}

func (a *app) tryDraft(d *draft, f rules.Feed, found watcher.Found, names *watcher.Names, now time.Time) error {
	for _, bad := range found.Refused {
		if slices.ContainsFunc(d.files, func(s *sampleFile) bool { return s.name == bad.File.Name }) {
			return bad
		}
	}
	tried := 0
	for _, file := range found.Ready {
		at := slices.IndexFunc(d.files, func(s *sampleFile) bool { return s.name == file.Name })
		if at < 0 {
			d.others++
			continue
		}
		sheet, err := source{}.Read(a.ctx, file, f, names, now, nil)
		if err != nil {
			return fmt.Errorf("nothing was written, since a sample is not readable as it is: %w", err)
		}
		d.files[at].rows = sheet.Rows
		tried++
	}
	if tried < len(d.files) {
		return fmt.Errorf("of %d samples of feed %s only %d are files that a feed takes (names that begin with a dot or end in .tmp, .part or ~ are not)",
			len(d.files), d.name, tried)
	}
	return nil
}
