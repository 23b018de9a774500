package config

import (
	"time"

	"strayd/rules"
)

var groupTable = object{what: "keys: name at least", fields: []field{
	{key: "name", required: true, shape: name(), doc: "What the group is called.",
		at: in(func(g *rules.Group) any { return &g.Name })},
	{key: "series", doc: "Ids or globs; what the register's group column names belongs to the group as well.",
		shape: list[string]{item: glob("a series' id or a pattern"), least: 1, unique: true, what: "a list of ids or patterns"},
		at:    in(func(g *rules.Group) any { return &g.Series })},
	{key: "reference", initial: rules.PeersReference, shape: text("a series' id, peers or none", filledPattern, filled),
		doc: "What residuals are taken against: a series' id, peers (the group's median) or none; the register's own column wins.",
		at:  in(func(g *rules.Group) any { return &g.Reference })},
	{key: "owner", shape: text("who looks after the group", filledPattern, filled), doc: "Who looks after the group.",
		at: in(func(g *rules.Group) any { return &g.Owner })},
	{key: "reply", shape: duration(time.Minute, 31*24*time.Hour), doc: "How soon an open flag asks for an answer.",
		at: in(func(g *rules.Group) any { return &g.Reply })},
	{key: "release", shape: dueTable, doc: "The release that an open flag of this group blocks.",
		at: in(func(g *rules.Group) any { g.Release = &rules.Due{}; return g.Release })},
	{key: "escalate", doc: "Names of the channels that are told of a flag past its reply or release; those that take it when left out.",
		shape: list[string]{item: name(), least: 1, unique: true, what: "a list of channels' names"},
		at:    in(func(g *rules.Group) any { return &g.Escalate })},
	{key: "four_eyes", initial: "false", shape: yes(), doc: "Whether a second person must sign a decision or a waiver off.",
		at: in(func(g *rules.Group) any { return &g.FourEyes })},
	{key: "materiality", shape: share(bounds{low: 0.0001, high: 1}),
		doc: "Size of an error, as a share of the NAV, from which your own rules call it material; the weekly log counts by it. None when left out.",
		at:  in(func(g *rules.Group) any { return &g.Materiality })},
}}

const (
	hard       = "limit" // the key beside which a range has none of its estimates
	beyondLine = "line"
)

var rangeTable = object{what: "keys: name at least", fields: []field{
	{key: "name", required: true, shape: name(), doc: "What the range is called.",
		at: in(func(r *rules.Range) any { return &r.Name })},
	{key: "of", initial: "return", shape: named(rules.Return, rules.Residual),
		doc: "What is judged: the return, or the residual that its reference leaves unexplained.",
		at:  in(func(r *rules.Range) any { return &r.Of })},
	{key: "for", doc: "Groups, ids or globs; every series when left out.",
		shape: list[string]{item: glob("a group's name, a series' id or a pattern"), least: 1, unique: true, what: "a list of groups, ids or patterns"},
		at:    in(func(r *rules.Range) any { return &r.For })},
	{key: "window", initial: "60", without: hard, shape: integer(smallestWindow, largestWindow), doc: "Past observations used to estimate.",
		at: in(func(r *rules.Range) any { return &r.Window })},
	{key: "scale", initial: "plain", without: hard, shape: named(rules.Plain, rules.Weighted, rules.MAD),
		doc: "plain: mean and deviation; weighted: zero mean, exponentially weighted; mad: median and median absolute deviation.",
		at:  in(func(r *rules.Range) any { return &r.Scale })},
	{key: "decay", initial: "0.94", without: hard, shape: number(bounds{low: 0, high: 1, openLow: true, openHigh: true}),
		doc: "Decay of a weighted scale an observation; another value than the default only with scale weighted.",
		at:  in(func(r *rules.Range) any { return &r.Decay })},
	{key: "tail", initial: "t5", without: hard, shape: oneOf{word: tailModels, keys: tailTable},
		doc: "The distribution of the tail: normal, t5, {t: df}, auto (degrees of freedom learnt from the group's own past), predictive-t or rank.",
		at:  in(func(r *rules.Range) any { return &r.Tail })},
	{key: "predictive", initial: "true", without: hard, shape: yes(),
		doc: "Whether a plain deviation is widened by sqrt(1 + 1/n) for the mean being estimated; other scales are not widened.",
		at:  in(func(r *rules.Range) any { return &r.Predictive })},
	{key: "side", initial: "both", without: hard, shape: named(rules.Both, rules.Lower, rules.Upper), doc: "Which tail is looked at.",
		at: in(func(r *rules.Range) any { return &r.Side })},
	{key: "watch", initial: "{tail: 1%}", without: hard, shape: lineTable, doc: "The inner line: beyond it a return is counted and shown.",
		at: in(func(r *rules.Range) any { return &r.Watch })},
	{key: "breach", initial: "{tail: 0.27%}", without: hard, shape: lineTable, doc: "The outer line: beyond it a return is flagged.",
		at: in(func(r *rules.Range) any { return &r.Breach })},
	{key: "pending", initial: "clip", without: hard, shape: named(rules.Clip, rules.Keep, rules.LeaveOut),
		doc: "How a flagged value enters the window until someone decides: clipped to the line, in full, or not at all.",
		at:  in(func(r *rules.Range) any { return &r.Pending })},
	{key: hard, doc: "A lower and an upper line set by a person or a mandate, instead of an estimated range.",
		shape: list[rules.Units]{item: exactReturn(), least: 2, most: 2, what: "two returns, the lower and the upper, such as [-50%, 50%]"},
		at: in(func(r *rules.Range) any {
			return func(two []rules.Units) { r.Limit = &rules.Limit{Low: two[0], High: two[1]} }
		})},
}}

// Windows: below five observations nothing is estimated; the exact sums hold up to the largest.
const (
	smallestWindow = 5
	largestWindow  = 32768
)

var tailModels = words(
	word[rules.TailModel]{"normal", rules.TailModel{Name: "normal"}},
	word[rules.TailModel]{"t5", rules.TailModel{Name: "t", DF: 5}},
	word[rules.TailModel]{"auto", rules.TailModel{Name: "auto"}},
	word[rules.TailModel]{"predictive-t", rules.TailModel{Name: "predictive-t"}},
	word[rules.TailModel]{"rank", rules.TailModel{Name: "rank"}},
)

var tailTable = object{what: "{t: 4}", fields: []field{
	{key: "t", required: true, shape: number(bounds{low: 2, high: 1e6, openLow: true}), doc: "Degrees of freedom of a t scaled to unit variance.",
		at: in(func(m *rules.TailModel) any { m.Name = "t"; return &m.DF })},
}}

var probability = bounds{low: 0, high: 1, openLow: true, openHigh: true}

var lineTable = object{what: "a line such as {tail: 0.27%}", fields: []field{
	{key: "tail", choice: beyondLine, shape: share(probability), doc: "Probability of a value at least this far out.",
		at: in(func(l *rules.Line) any { return &l.Tail })},
	{key: "confidence", choice: beyondLine, shape: share(probability), doc: "Share of observations expected inside.",
		at: in(func(l *rules.Line) any { return &l.Confidence })},
	{key: "z", choice: beyondLine, shape: number(bounds{low: 0, high: 1000, openLow: true}), doc: "Deviations from the centre.",
		at: in(func(l *rules.Line) any { return &l.Z })},
	{key: "budget", choice: beyondLine, shape: budget(), doc: "Flags a week, over all series and ranges.",
		at: in(func(l *rules.Line) any { return &l.Budget })},
}}

var channelTable = object{what: "keys: name, and slack, webhook, mail or console", fields: []field{
	{key: "name", required: true, shape: name(), doc: "What the channel is called.",
		at: in(func(c *rules.Channel) any { return &c.Name })},
	{key: "slack", choice: "channel", shape: slackTable, doc: "A chat channel; its token comes from the environment or a file, never from here.",
		at: in(func(c *rules.Channel) any { c.Kind = "slack"; return c })},
	{key: "webhook", choice: "channel", shape: webhookTable,
		doc: "An address that gets signed JSON; the secret comes from the environment or a file, never from here.",
		at:  in(func(c *rules.Channel) any { c.Kind = "webhook"; return c })},
	{key: "mail", choice: "channel", shape: mailTable,
		doc: "Mail through one server; user and password come from the environment or files, never from here.",
		at:  in(func(c *rules.Channel) any { c.Kind, c.Mail = "mail", &rules.Mail{}; return c.Mail })},
	{key: "console", choice: "channel", shape: object{what: "{}"}, doc: "The standard output of the run.",
		at: in(func(c *rules.Channel) any { c.Kind = "console"; return c })},
	{key: "for", doc: "Names of groups; everything when left out.",
		shape: list[string]{item: name(), least: 1, unique: true, what: "a list of groups' names"},
		at:    in(func(c *rules.Channel) any { return &c.For })},
	{key: "kinds", doc: "Kinds of flag; all when left out.",
		shape: list[rules.Kind]{item: named(rules.Kinds...), least: 1, unique: true, what: "a list of kinds of flag"},
		at:    in(func(c *rules.Channel) any { return &c.Kinds })},
	{key: "hours", shape: hours(), doc: "Part of the day in which notices are delivered; outside it they are held. Always when left out.",
		at: in(func(c *rules.Channel) any { return func(s span) { c.From, c.To = s.from, s.to } })},
	{key: "form", initial: "full", shape: words(word[bool]{"full", false}, word[bool]{"short", true}), doc: "full, or short: ref and series only.",
		at: in(func(c *rules.Channel) any { return &c.Short })},
	{key: "fallback", shape: name(), doc: "Name of the channel that takes the waiting notices when this one is dead or delivers nothing.",
		at: in(func(c *rules.Channel) any { return &c.Fallback })},
	{key: "fallback_after", initial: "15m", shape: duration(time.Minute, 24*time.Hour), doc: "How long it delivers nothing before that.",
		at: in(func(c *rules.Channel) any { return &c.After })},
}}

var slackTable = object{what: "{channel: C0000000000}", fields: []field{
	{key: "channel", required: true, shape: slackChannel(), doc: "The channel's id.",
		at: in(func(c *rules.Channel) any { return &c.Target })},
}}

var webhookTable = object{what: "{url: https://...}", fields: []field{
	{key: "url", required: true, shape: webAddress(), doc: "The address: https, or http on this machine.",
		at: in(func(c *rules.Channel) any { return &c.Target })},
}}

var mailTable = object{what: "keys: to, from, server, and also tls", fields: []field{
	{key: "to", required: true, doc: "The recipients.",
		shape: list[string]{item: mailAddress(), least: 1, most: 50, unique: true, what: "a list of 1 to 50 mail addresses"},
		at:    in(func(m *rules.Mail) any { return &m.To })},
	{key: "from", required: true, shape: mailAddress(), doc: "The sender.",
		at: in(func(m *rules.Mail) any { return &m.From })},
	{key: "server", required: true, shape: hostPort(), doc: "The server, as host:port.",
		at: in(func(m *rules.Mail) any { return &m.Server })},
	{key: "tls", initial: "starttls", shape: named("starttls", "implicit", "none"),
		doc: "starttls (mostly port 587), implicit (mostly port 465), or none on this machine.",
		at:  in(func(m *rules.Mail) any { return &m.Security })},
}}
