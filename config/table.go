package config

import (
	"time"

	"strayd/rules"
)

// table is the one list of keys: Parse walks it, and Schema is made of it.
var table = object{what: "keys: ledger, feeds and ranges at least", fields: []field{
	{key: "ledger", required: true, shape: file("the ledger's file, such as ledger.db", false),
		doc: "The file of the ledger, relative to this one.",
		at:  in(func(c *Config) any { return &c.Ledger })},
	{key: "timezone", initial: "UTC", shape: zone(),
		doc: "The time zone of schedules, and of deadlines that name none.",
		at: in(func(c *Config) any {
			return func(z *time.Location) { c.Timezone, c.Location = z.String(), z }
		})},
	{key: "calendar", initial: everyWeekday, shape: calendar(),
		doc: "Business days: weekdays, a nation's two-letter code, or a file of holidays; also a week such as sun-thu, and several joined by +.",
		at:  in(func(c *Config) any { return &c.Calendar })},
	{key: "feeds", required: true, doc: "The regular files, each from one source.",
		shape: list[rules.Feed]{item: feedTable, least: 1, what: "a list of at least one feed"},
		at:    in(func(c *Config) any { return &c.Feeds })},
	{key: "series", shape: file("the register's file, such as series.csv", true),
		doc: "The register of series: series,name,group,reference,fx,calendar,start,end,owner.",
		at:  in(func(c *Config) any { return &c.Series })},
	{key: "events", shape: file("the events' file, such as events.csv", true),
		doc: "Distributions (fraction of the previous NAV) and splits (new units per old): date,series,kind,amount.",
		at:  in(func(c *Config) any { return &c.Events })},
	{key: "groups", doc: "Series that are judged together.",
		shape: list[rules.Group]{item: groupTable, what: "a list of groups"},
		at:    in(func(c *Config) any { return &c.Groups })},
	{key: "ranges", required: true, doc: "The expected ranges and the limits.",
		shape: list[rules.Range]{item: rangeTable, least: 1, what: "a list of at least one range"},
		at:    in(func(c *Config) any { return &c.Ranges })},
	{key: "doubtful", initial: "0.2%", shape: share(bounds{low: 0, high: 0.1}),
		doc: "Share of ordinary observations that may be flagged doubtful, stale or repeat, together. 0% for none: then series without " +
			"group and reference go by pending alone.",
		at: in(func(c *Config) any { return &c.Doubtful })},
	{key: "root", initial: "allowed", shape: words(word[bool]{"allowed", false}, word[bool]{"forbidden", true}),
		doc: "Whether root may enter anything into the record. What root does is recorded as such; it may be anybody who has that right.",
		at:  in(func(c *Config) any { return &c.RootForbidden })},
	{key: "channels", initial: "[{name: console, console: {}}]", doc: "Where notices go; the console when left out.",
		shape: list[rules.Channel]{item: channelTable, least: 1, what: "a list of at least one channel"},
		at:    in(func(c *Config) any { return &c.Channels })},
	{key: "weekly", shape: weeklyTable, doc: "The weekly log.",
		at: in(func(c *Config) any { c.Weekly = &Weekly{}; return c.Weekly })},
	{key: "page", shape: pageTable, doc: "The desk's page; when left out it is served on a free port, from the first link on.",
		at: in(func(c *Config) any { return &c.Page })},
}}

var pageTable = object{what: "keys: listen, host, identity", fields: []field{
	{key: "listen", shape: loopback(), doc: "The loopback address of the page, such as 127.0.0.1:9302; a free port when left out.",
		at: in(func(p *Page) any { return &p.Listen })},
	{key: "host", shape: fitting("a host's name", "desk.example.org", hostPattern),
		doc: "The name under which a reverse proxy on this machine serves the page.",
		at:  in(func(p *Page) any { return &p.Host })},
	{key: "identity", shape: fitting("a header's name", "X-Remote-User", headerPattern),
		doc: "The header in which that proxy names the user of the operating system who asks; the proxy proves itself by a secret.",
		at:  in(func(p *Page) any { return &p.Identity })},
}}

var weeklyTable = object{what: "keys: schedule, channels", fields: []field{
	{key: "schedule", initial: `"0 7 * * mon"`, shape: cron(), doc: "When the weekly log is written, as cron text.",
		at: in(func(w *Weekly) any { return &w.Schedule })},
	{key: "channels", doc: "Names of the channels that get it; all when left out.",
		shape: list[string]{item: name(), least: 1, unique: true, what: "a list of channels' names"},
		at:    in(func(w *Weekly) any { return &w.Channels })},
}}

var feedTable = object{what: "keys: name and files at least", fields: []field{
	{key: "name", required: true, shape: name(), doc: "What the feed is called.",
		at: in(func(f *rules.Feed) any { return &f.Name })},
	{key: "files", required: true, shape: files(), doc: "Folder and pattern of the files, relative to this one; also .csv.gz.",
		at: in(func(f *rules.Feed) any { return func(p pattern) { f.Dir, f.Pattern = p.dir, p.name } })},
	{key: "schedule", shape: cron(), doc: "When the folder is looked at, as cron text in the configuration's time zone.",
		at: in(func(f *rules.Feed) any { return &f.Schedule })},
	{key: "due", shape: dueTable, doc: "When the feed must be whole, or it is late.",
		at: in(func(f *rules.Feed) any { f.Due = &rules.Due{}; return f.Due })},
	{key: "layout", initial: "long", shape: named(rules.Long, rules.Wide),
		doc: "long: one row an observation; wide: one row a date, one column a series.",
		at:  in(func(f *rules.Feed) any { return &f.Layout })},
	{key: "columns", initial: "{}", shape: columnsTable, doc: "The names of the columns in the header row.",
		at: in(func(f *rules.Feed) any { return &f.Columns })},
	{key: "value", initial: "return", shape: named(rules.OfReturn, rules.OfPrice),
		doc: "What the values are; prices are turned into simple returns.",
		at:  in(func(f *rules.Feed) any { return &f.Value })},
	{key: "unit", initial: "fraction", shape: named(rules.Fraction, rules.Percent, rules.BP),
		doc: "What a return of 1 in the file means: 1 (fraction), 1/100 (percent) or 1/10000 (bp). Prices have none.",
		at:  in(func(f *rules.Feed) any { return &f.Unit })},
	{key: "date", initial: "YYYY-MM-DD", shape: dateStyle(), doc: "How dates are written: YYYY or YY, MM or MMM, DD; or excel for serial days.",
		at: in(func(f *rules.Feed) any { return &f.DateStyle })},
	{key: "decimal", initial: `"."`, shape: words(word[byte]{".", '.'}, word[byte]{",", ','}), doc: "The decimal sign of the numbers.",
		at: in(func(f *rules.Feed) any { return &f.Decimal })},
	{key: "separator", initial: `","`, doc: "What stands between two cells.",
		shape: words(word[byte]{",", ','}, word[byte]{";", ';'}, word[byte]{"\t", '\t'}, word[byte]{"tab", '\t'}, word[byte]{"|", '|'}),
		at:    in(func(f *rules.Feed) any { return &f.Separator })},
	{key: "sheet", shape: text("a sheet's name", filledPattern, filled), doc: "The sheet of a spreadsheet (.xlsx); its only visible one when left out.",
		at: in(func(f *rules.Feed) any { return &f.Sheet })},
	{key: "encoding", initial: "utf-8", shape: named("utf-8", "utf-16", "latin-1"), doc: "The encoding of the text.",
		at: in(func(f *rules.Feed) any { return &f.Encoding })},
	{key: "missing", initial: `["", NA, n/a]`, doc: "Cells that mean that there is no value.",
		shape: list[string]{item: text("a cell's text", "", nil), unique: true, what: "a list of texts"},
		at:    in(func(f *rules.Feed) any { return &f.Missing })},
	{key: "settle", initial: "60s", shape: duration(0, 24*time.Hour), doc: "How old a file must be before it is read.",
		at: in(func(f *rules.Feed) any { return &f.Settle })},
	{key: "sentinel", initial: `""`, shape: sentinel(), doc: "Ending of the companion file that says that a file is whole; empty for none.",
		at: in(func(f *rules.Feed) any { return &f.Sentinel })},
	{key: "bad_rows", initial: "refuse", doc: "refuse: the first bad row refuses the file; skip: the greatest share of bad rows that are left out.",
		shape: oneOf{word: words(word[float64]{"refuse", 0}), keys: skipTable},
		at:    in(func(f *rules.Feed) any { return &f.SkipShare })},
}}

var skipTable = object{what: "{skip: 1%}", fields: []field{
	{key: "skip", required: true, shape: share(bounds{low: 0, high: 0.5, openLow: true}), doc: "Greatest share of bad rows that are left out.",
		at: in(func(share *float64) any { return share })},
}}

var columnsTable = object{what: "keys: date, series, value, status, days", fields: []field{
	{key: "date", initial: "date", shape: columnName(), doc: "The valuation date.",
		at: in(func(c *rules.Columns) any { return &c.Date })},
	{key: "series", shape: columnName(), doc: "The series' id (long only); series when left out.",
		at: in(func(c *rules.Columns) any { return &c.Series })},
	{key: "value", shape: columnName(), doc: "The return or price (long only); return or price, after the feed's value, when left out.",
		at: in(func(c *rules.Columns) any { return &c.Value })},
	{key: "status", shape: columnName(), doc: "estimate or final (long only); none when left out.",
		at: in(func(c *rules.Columns) any { return &c.Status })},
	{key: "days", shape: columnName(), doc: "Business days that the return covers (long only); none when left out.",
		at: in(func(c *rules.Columns) any { return &c.Days })},
}}

func columnName() shape { return text("a column's name in the header row", filledPattern, filled) }

var dueTable = object{what: "keys: at, and also days, timezone", fields: []field{
	{key: "at", required: true, shape: clock(), doc: "Time of day.",
		at: in(func(d *rules.Due) any { return &d.Minutes })},
	{key: "days", initial: "0", shape: integer(0, 30), doc: "Business days after the valuation date.",
		at: in(func(d *rules.Due) any { return &d.Days })},
	{key: "timezone", shape: zone(), doc: "Time zone; the configuration's when left out.",
		at: in(func(d *rules.Due) any { return func(z *time.Location) { d.Timezone = z.String() } })},
}}
