package config

import (
	"fmt"
	"path/filepath"
	"slices"

	"strayd/rules"
)

// cross checks what ties keys together, and fills the defaults that depend on other keys. It skips what already has a fault.
func (d *decoder) cross(c *Config) {
	distinct(d, "feeds", c.Feeds, func(f rules.Feed) string { return f.Name })
	distinct(d, "groups", c.Groups, func(g rules.Group) string { return g.Name })
	distinct(d, "ranges", c.Ranges, func(r rules.Range) string { return r.Name })
	distinct(d, "channels", c.Channels, func(ch rules.Channel) string { return ch.Name })
	d.paths(c)
	for i := range c.Feeds {
		d.feed(fmt.Sprintf("feeds[%d]", i), &c.Feeds[i], c)
	}
	d.sources(c.Feeds)
	for i := range c.Groups {
		d.group(fmt.Sprintf("groups[%d]", i), &c.Groups[i], c)
	}
	d.membership(c.Groups)
	for i := range c.Ranges {
		d.expected(fmt.Sprintf("ranges[%d]", i), &c.Ranges[i])
	}
	d.routes(c)
	d.page(&c.Page)
}

// distinct refuses a name that an earlier entry of the list has.
func distinct[T any](d *decoder, list string, all []T, name func(T) string) {
	first := map[string]int{}
	for i, v := range all {
		p := fmt.Sprintf("%s[%d].name", list, i)
		if !d.sound(p) || name(v) == "" {
			continue
		}
		if j, ok := first[name(v)]; ok {
			d.failAt(p, trouble{message: "a name given twice", got: shown(name(v)),
				hint: fmt.Sprintf("first in line %d", d.given[fmt.Sprintf("%s[%d].name", list, j)].value.Line)})
			continue
		}
		first[name(v)] = i
	}
}

// paths refuses to use one file for two purposes.
func (d *decoder) paths(c *Config) {
	own, err := d.opt.Absolute(c.File)
	if err != nil {
		own = c.File
	}
	taken := map[string]string{filepath.Clean(own): "this configuration"}
	for _, p := range []struct{ key, file string }{{"series", c.Series}, {"events", c.Events}, {"calendar", c.Calendar.Path}, {"ledger", c.Ledger}} {
		if p.file == "" || !d.sound(p.key) {
			continue
		}
		if other, ok := taken[p.file]; ok {
			d.failAt(p.key, trouble{message: "one file for two purposes", got: "the file of " + other})
			continue
		}
		taken[p.file] = p.key
	}
}

func (d *decoder) feed(p string, f *rules.Feed, c *Config) {
	d.zoned(f.Due, c)
	d.columns(p, f)
	if f.Value == rules.OfPrice {
		f.Unit = rules.Fraction // a ratio of prices has no unit
	}
	if f.Decimal == f.Separator && f.Decimal != 0 && d.sound(p+".decimal", p+".separator") {
		at := p + ".separator"
		if d.has(p + ".decimal") {
			at = p + ".decimal"
		}
		d.failAt(at, trouble{message: "decimal and separator are the same", got: fmt.Sprintf("%q for both", f.Decimal),
			hint: `files with decimal commas mostly have separator ";"`})
	}
}

// zoned gives a deadline the configuration's business days, and where it has none its time zone.
func (d *decoder) zoned(due *rules.Due, c *Config) {
	if due == nil {
		return
	}
	due.Calendar = c.Calendar.Days
	if due.Timezone == "" {
		due.Timezone = c.Timezone
	}
}

// columns fills the columns that depend on layout and value, and refuses one name for two of them.
func (d *decoder) columns(p string, f *rules.Feed) {
	at := p + ".columns"
	if !d.sound(at, p+".layout", p+".value") {
		return
	}
	if f.Layout == rules.Wide {
		d.wideColumns(at)
		return
	}
	c := &f.Columns
	c.Series = either(c.Series, "series")
	c.Value = either(c.Value, string(f.Value))
	taken := map[string]string{}
	for _, col := range []struct{ key, name string }{{"date", c.Date}, {"series", c.Series}, {"value", c.Value}, {"status", c.Status}, {"days", c.Days}} {
		if other, ok := taken[col.name]; ok && col.name != "" {
			d.failAt(join(at, col.key), trouble{message: "one column for two purposes", got: shown(col.name) + ", which is " + other + " as well"})
		}
		taken[col.name] = col.key
	}
}

func (d *decoder) wideColumns(at string) {
	for _, key := range columnsTable.keys()[1:] {
		if p := join(at, key); d.has(p) {
			d.failAt(p, trouble{message: "a wide file has no such column", want: "date alone"})
		}
	}
}

// sources refuses two feeds that read the same files: each file would be taken twice.
func (d *decoder) sources(feeds []rules.Feed) {
	first := map[pattern]string{}
	for i, f := range feeds {
		at := pattern{f.Dir, f.Pattern}
		p := fmt.Sprintf("feeds[%d].files", i)
		if other, ok := first[at]; ok && f.Pattern != "" && d.sound(p) {
			d.failAt(p, trouble{message: "the same files as another feed", got: "the files of " + shown(other)})
		}
		first[at] = f.Name
	}
}

func (d *decoder) group(p string, g *rules.Group, c *Config) {
	d.zoned(g.Release, c)
	if len(g.Series) == 0 && !d.has("series") && d.sound(p) {
		d.failAt(p, trouble{message: "a group that nothing fills", want: "series, or a register with a group column"})
	}
}

// membership refuses an entry that stands in two groups. Patterns that overlap in other ways show only when series are known.
func (d *decoder) membership(groups []rules.Group) {
	home := map[string]string{}
	for i, g := range groups {
		for j, s := range g.Series {
			p := fmt.Sprintf("groups[%d].series[%d]", i, j)
			if other, ok := home[s]; ok && other != g.Name && d.sound(p) {
				d.failAt(p, trouble{message: "in two groups", got: shown(s) + ", which is in " + shown(other) + " as well"})
			}
			home[s] = g.Name
		}
	}
}

// routes holds that channels name known groups and the weekly log known channels. A register may name further groups.
func (d *decoder) routes(c *Config) {
	var groups, channels []string
	for _, g := range c.Groups {
		groups = append(groups, g.Name)
	}
	for _, ch := range c.Channels {
		channels = append(channels, ch.Name)
	}
	for i, ch := range c.Channels {
		if !d.has("series") && d.sound("groups") {
			d.known(fmt.Sprintf("channels[%d].for", i), "group", ch.For, groups)
		}
	}
	for i := range c.Channels {
		d.channel(fmt.Sprintf("channels[%d]", i), &c.Channels[i], c.Channels)
	}
	for i, g := range c.Groups {
		if d.sound("channels") {
			d.known(fmt.Sprintf("groups[%d].escalate", i), "channel", g.Escalate, channels)
		}
	}
	if c.Weekly != nil && d.sound("channels") {
		d.known("weekly.channels", "channel", c.Weekly.Channels, channels)
	}
}

func (d *decoder) known(path, what string, names, list []string) {
	for i, n := range names {
		p := fmt.Sprintf("%s[%d]", path, i)
		if slices.Contains(list, n) || !d.sound(p) {
			continue
		}
		want := nearest(n, list)
		if want == "" {
			want = either(spelled(list), "no "+what+" at all, as none is configured")
		}
		d.failAt(p, trouble{message: "no such " + what, got: shown(n), want: want})
	}
}
