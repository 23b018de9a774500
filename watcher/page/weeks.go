package page

import (
	"errors"
	"io/fs"
	"net/http"
	"regexp"
	"slices"
	"strings"
	"time"
)

// week is one archived weekly log.
type week struct {
	Name  string
	Forms []string // endings that are there
	At    time.Time
}

// weekFile is the name of an archived log: nothing else is given out of its folder.
var weekFile = regexp.MustCompile(`^[0-9]{4}-W[0-9]{2}\.(html|txt|csv)$`)

func (p *Page) showWeeks(v *visit) error {
	weeks, err := weeksIn(p.src.Book().Weeks)
	if err != nil {
		return err
	}
	return v.show(http.StatusOK, "weeks", "Weekly logs", "weeks", map[string]any{"Weeks": weeks, "Zone": p.src.Book().Zone}, v.desk.hear())
}

// weeksIn lists the logs of a folder, newest first.
func weeksIn(folder fs.FS) (out []week, err error) {
	entries, err := fs.ReadDir(folder, ".")
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return nil, err
	}
	slices.Reverse(entries)
	for _, e := range entries {
		if !weekFile.MatchString(e.Name()) || !e.Type().IsRegular() {
			continue
		}
		name, form, _ := strings.Cut(e.Name(), ".")
		if n := len(out); n == 0 || out[n-1].Name != name {
			out = append(out, week{Name: name})
		}
		w := &out[len(out)-1]
		w.Forms = append([]string{form}, w.Forms...)
		if info, err := e.Info(); err == nil {
			w.At = info.ModTime()
		}
	}
	return out, nil
}

// kinds are the content types of the forms of a log.
var kinds = map[string]string{"html": "text/html; charset=utf-8", "txt": "text/plain; charset=utf-8", "csv": "text/csv; charset=utf-8"}

// weekPolicy lets an archived page use the style that it carries, and nothing else.
const weekPolicy = "default-src 'none'; style-src 'unsafe-inline'; form-action 'none'; base-uri 'none'; frame-ancestors 'none'; sandbox"

func (p *Page) showWeek(v *visit) error {
	name := v.r.URL.Query().Get("file")
	if !weekFile.MatchString(name) {
		return notThere("no weekly log %q", name)
	}
	text, err := fs.ReadFile(p.src.Book().Weeks, name)
	if errors.Is(err, fs.ErrNotExist) {
		return notThere("no weekly log %q is archived", name)
	}
	if err != nil {
		return err
	}
	_, form, _ := strings.Cut(name, ".")
	v.w.Header().Set("Content-Type", kinds[form])
	v.w.Header().Set("Content-Security-Policy", weekPolicy)
	_, err = v.w.Write(text)
	return err
}
