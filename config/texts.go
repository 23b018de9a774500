package config

import (
	"errors"
	"path"
	"path/filepath"
	"regexp"
	"strings"
	"time"
	"unicode"

	"gopkg.in/yaml.v3"
)

// text is text on one line; check (nil: none) refuses what it may not be.
func text(what, pattern string, check func(d *decoder, s string) error) shape {
	return converted(what, pattern, func(d *decoder, s string) (string, error) {
		if check == nil {
			return s, nil
		}
		return s, check(d, s)
	})
}

// converted is text that becomes a T. The JSON Schema holds the pattern only ("" for none).
func converted[T any](what, pattern string, convert func(d *decoder, s string) (T, error)) shape {
	json := map[string]any{"type": "string"}
	if pattern != "" {
		json["pattern"] = pattern
	}
	return scalar[T]{what: what, json: json, parse: func(d *decoder, n *yaml.Node) (v T, err error) {
		if n.ShortTag() != "!!str" {
			return v, trouble{message: "not text", hint: "put it in quotes"}
		}
		if strings.ContainsFunc(n.Value, func(r rune) bool { return !unicode.IsPrint(r) }) {
			return v, errors.New("a character that does not print")
		}
		return convert(d, n.Value)
	}}
}

const (
	filledPattern = `^\S(.*\S)?$`
	namePattern   = `^[^\s*?\[\]\\:](([^*?\[\]\\:])*[^\s*?\[\]\\:])?$`
)

var filledText = regexp.MustCompile(filledPattern)

func filled(_ *decoder, s string) error {
	if !filledText.MatchString(s) {
		return errors.New("empty, or with spaces around it")
	}
	return nil
}

var nameText = regexp.MustCompile(namePattern)

// longestName is the longest name, in characters.
const longestName = 64

// name is what feeds, groups, ranges and channels are called. It stands in lists beside globs, so it holds no glob's character.
func name() shape {
	return text("a name of up to 64 characters without * ? [ ] \\ :", namePattern, func(_ *decoder, s string) error {
		if !nameText.MatchString(s) || len([]rune(s)) > longestName {
			return errors.New("not a name")
		}
		return nil
	})
}

// glob is a series' id or a pattern of ids, or a group's name.
func glob(what string) shape {
	return text(what, filledPattern, func(d *decoder, s string) error {
		if _, err := path.Match(s, ""); err != nil {
			return errors.New("not a well-formed pattern")
		}
		return filled(d, s)
	})
}

// file is a path, relative to the configuration's folder; held absolute.
func file(what string, mustExist bool) shape {
	return converted(what, filledPattern, func(d *decoder, s string) (string, error) {
		if err := filled(d, s); err != nil {
			return "", err
		}
		full := d.absolute(s)
		if strings.HasSuffix(s, "/") {
			return "", errors.New("a folder where a file is meant")
		}
		if mustExist {
			return full, d.exists(full)
		}
		return full, nil
	})
}

func (d *decoder) absolute(p string) string {
	if filepath.IsAbs(p) {
		return filepath.Clean(p)
	}
	return filepath.Join(d.folder, p)
}

func (d *decoder) exists(p string) error {
	info, err := d.opt.Stat(p)
	switch {
	case err != nil:
		return trouble{message: "the file cannot be found", want: "an existing file, relative to this configuration"}
	case !info.Mode().IsRegular():
		return trouble{message: "not a regular file", want: "an existing file, relative to this configuration"}
	}
	return nil
}

// pattern is a folder and a pattern of names within it.
type pattern struct{ dir, name string }

func files() shape {
	return converted("a folder and a pattern of file names, such as inbox/*.csv", filledPattern, func(d *decoder, s string) (pattern, error) {
		if err := filled(d, s); err != nil {
			return pattern{}, err
		}
		dir, last := path.Split(s)
		switch _, err := path.Match(last, ""); {
		case strings.ContainsAny(dir, `*?[`):
			return pattern{}, trouble{message: "a pattern in the folder", hint: "only file names may have one; write a feed for each folder"}
		case last == "" || last == "." || last == "..":
			return pattern{}, errors.New("a folder without a file name")
		case err != nil:
			return pattern{}, errors.New("not a well-formed pattern")
		}
		return pattern{d.absolute(either(dir, ".")), last}, nil
	})
}

// zone is a time zone by its name in the time zone database.
func zone() shape {
	return converted("a time zone such as UTC or Europe/Zurich", filledPattern, func(d *decoder, s string) (*time.Location, error) {
		if err := filled(d, s); err != nil {
			return nil, err
		}
		z, err := d.opt.Zone(s)
		if err != nil || s == "Local" { // Local differs by machine
			return nil, errors.New("not a known time zone")
		}
		return z, nil
	})
}

// cron is cron text, checked by the schedule's own parser.
func cron() shape {
	return text("cron text such as 0 18 * * mon-fri", filledPattern, func(d *decoder, s string) error {
		if d.opt.Cron == nil {
			return nil
		}
		if err := d.opt.Cron(s); err != nil {
			return errors.New("not a schedule: " + err.Error())
		}
		return nil
	})
}

const (
	nationPattern = `^[A-Za-z]{2}(-[A-Za-z0-9]{1,3})?$|^ECB$`
	weekPattern   = `^(weekdays|daily|(sun|mon|tue|wed|thu|fri|sat)-(sun|mon|tue|wed|thu|fri|sat))$`
)

var (
	nationText = regexp.MustCompile(nationPattern)
	weekText   = regexp.MustCompile(weekPattern)
)

// everyWeekday is the calendar whose business days are all weekdays.
const everyWeekday = "weekdays"

func calendar() shape {
	what := "weekdays, a nation's two-letter code, or a file of holidays"
	return converted(what, filledPattern, func(d *decoder, s string) (Calendar, error) {
		c := Calendar{Name: s}
		for part := range strings.SplitSeq(s, "+") {
			part = strings.TrimSpace(part)
			if weekText.MatchString(part) || nationText.MatchString(part) {
				continue
			}
			full := d.absolute(part)
			if err := d.exists(full); err != nil || part == "" {
				return Calendar{}, trouble{message: "not a known calendar, and no such file"}
			}
			if part == s {
				c.Path = full
			}
		}
		if d.opt.Calendar == nil {
			return c, nil
		}
		var err error
		c.Days, err = d.opt.Calendar(s, d.absolute)
		return c, err
	})
}

var dateToken = regexp.MustCompile(`YYYY|YY|MMM|MM|DD`)

// excelDays is the date style of a spreadsheet's serial days.
const excelDays = "excel"

// dateStyle is one year, one month and one day, in any order, with separators or none.
func dateStyle() shape {
	what := "YYYY or YY, MM or MMM, and DD once each with - . / or a space between, or excel"
	return text(what, filledPattern, func(d *decoder, s string) error {
		kinds := map[byte]int{}
		for _, token := range dateToken.FindAllString(s, -1) {
			kinds[token[0]]++
		}
		rest := strings.Trim(dateToken.ReplaceAllString(s, ""), "-./ ")
		once := kinds['Y'] == 1 && kinds['M'] == 1 && kinds['D'] == 1
		if s != excelDays && (rest != "" || !once) {
			return errors.New("not a date style")
		}
		return filled(d, s)
	})
}

const (
	sentinelPattern = `^(\.[^/\s]+)?$`
	slackPattern    = `^[CGD][A-Z0-9]{6,}$`
)

var (
	sentinelText = regexp.MustCompile(sentinelPattern)
	slackText    = regexp.MustCompile(slackPattern)
)

func sentinel() shape {
	return text(`an ending that begins with a dot, such as .done, or "" for none`, sentinelPattern, func(_ *decoder, s string) error {
		if !sentinelText.MatchString(s) {
			return errors.New("not a file ending")
		}
		return nil
	})
}

func slackChannel() shape {
	return text("a channel's id such as C0000000000", slackPattern, func(_ *decoder, s string) error {
		if !slackText.MatchString(s) {
			return trouble{message: "not a channel's id", hint: "the id is at the foot of the channel's details; names are not taken"}
		}
		return nil
	})
}
