package config

import (
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"time"

	"strayd/rules"
)

// Config is a checked configuration. Paths are absolute.
type Config struct {
	File          string // as given to Load or Parse
	Ledger        string
	Timezone      string // name of Location
	Location      *time.Location
	Calendar      Calendar
	Feeds         []rules.Feed
	Series        string // path of the register; "" for none
	Events        string // path of the events; "" for none
	Groups        []rules.Group
	Ranges        []rules.Range
	Doubtful      float64 // share of ordinary observations, a fraction
	Channels      []rules.Channel
	Weekly        *Weekly // nil when there is none
	Page          Page
	RootForbidden bool // root may enter nothing into the record
}

// Calendar says which days are business days, in parts joined by +: a week, a nation's, or those of a file.
type Calendar struct {
	Name string // as written
	Path string // of the file when it is one file; "" for none
	Days *rules.Calendar
}

// Weekly is when the weekly log is written and where it goes.
type Weekly struct {
	Schedule string
	Channels []string // empty for all
}

// Page is where the desk's page is served, beyond a free port of this machine.
type Page struct {
	Listen   string // loopback address, "" for a free port
	Host     string // by which a reverse proxy serves it, "" for none
	Identity string // the header in which that proxy names who asks, "" where nobody is believed
}

// Options are what reading needs from outside. The zero value works.
type Options struct {
	Cron     func(spec string) error                                               // checks cron text; nil: not checked
	Calendar func(text string, place func(string) string) (*rules.Calendar, error) // reads a calendar whose files lie where place says; nil: not read
	Stat     func(path string) (fs.FileInfo, error)                                // nil: os.Stat
	Zone     func(name string) (*time.Location, error)                             // nil: time.LoadLocation
	Absolute func(path string) (absolute string, err error)                        // nil: filepath.Abs
	Set      []string                                                              // lines, PATH=VALUE, in place of the file's
}

func (o Options) filled() Options {
	if o.Stat == nil {
		o.Stat = os.Stat
	}
	if o.Zone == nil {
		o.Zone = time.LoadLocation
	}
	if o.Absolute == nil {
		o.Absolute = filepath.Abs
	}
	return o
}

// largest is the largest configuration, in bytes.
const largest = 1 << 20

// Load reads and checks a file. The error is Errors when the content is wrong.
func Load(path string, opt Options) (*Config, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("configuration: %w", err)
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, largest+1))
	if err != nil {
		return nil, fmt.Errorf("configuration: %w", err)
	}
	return Parse(path, data, opt)
}

// Parse checks the content of the file that name stands for; relative paths in it are relative to that file's folder. The error
// is Errors, with everything that is wrong, in the order of the file.
func Parse(name string, data []byte, opt Options) (*Config, error) {
	opt = opt.filled()
	folder, err := opt.Absolute(filepath.Dir(name))
	if err != nil {
		return nil, fmt.Errorf("configuration: %w", err)
	}
	d := newDecoder(opt, folder)
	c := &Config{File: name}
	if root := d.document(data); root != nil {
		d.set(root, opt.Set)
		d.tree(root, "")
		table.read(d, "", root, c)
		d.cross(c)
	}
	if len(d.faults) > 0 {
		return nil, d.sorted(name)
	}
	return c, nil
}
