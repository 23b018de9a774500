package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"html/template"
	"os"
	"strconv"
	"time"

	"strayd/notify"
	"strayd/notify/chart"
	"strayd/rules"
	"strayd/watcher"
	"strayd/watcher/desk"
	"strayd/watcher/health"
	"strayd/watcher/page"
)

// pageSources hand the page what it needs of the daemon.
func (d *daemon) pageSources() page.Sources {
	now := d.desk.now
	if now == nil {
		now = time.Now
	}
	return page.Sources{
		Now:     now,
		View:    d.ledger.View,
		Book:    d.pageBook,
		Explain: evidenceOf,
		Do:      d.doFor,
		Expect:  d.expectFor,
		Draw:    drawn,
		Host: func(host string) bool {
			return health.LoopbackHost(host) || sameHost(host, d.inForce().config.Page.Host)
		},
		Proxied: func(r page.Asked) (rules.Person, bool) { return d.inForce().proxy.vouches(r) },
		Log:     d.log,
	}
}

// doFor carries a command line out for somebody at the page, as if it had come over the socket.
func (d *daemon) doFor(ctx context.Context, who rules.Person, args []string) (ok bool, text string) {
	var out bytes.Buffer
	code := d.command(ctx, desk.Call{Args: args, Settings: d.inForce().hash, Who: who}, &out, &out)
	return code == exitDone, out.String()
}

// pageBook is what the configuration in force says to the page.
func (d *daemon) pageBook() page.Book {
	s := d.inForce()
	c := s.config
	b := page.Book{Zone: c.Location, Groups: c.Groups, Feeds: c.Feeds, Business: c.Calendar.Days, Weeks: os.DirFS(weekFolder(c))}
	if s.owners != nil {
		b.Owner = func(series string) string { return s.owners[series] }
	}
	if channels, err := s.post.sender.Health(); err == nil {
		b.Troubles = notify.Troubles(channels)
	}
	return b
}

// expectFor says what would be in range next for a series.
func (d *daemon) expectFor(series string, each func(watcher.Expected) error) error {
	s := d.inForce()
	p, err := d.program.newPass(s.config, d.ledger)
	if err != nil {
		return err
	}
	return p.Expect(series, rules.DateFrom(p.Now.In(s.config.Location)), each)
}

// drawn is a chart as the page takes it.
func drawn(v watcher.View, of watcher.ChartOf) (*page.Picture, error) {
	r, err := watcher.NewReader(v)
	if err != nil {
		return nil, err
	}
	c, err := r.Chart(of)
	if err != nil {
		return nil, err
	}
	svg := func(id string, width, height int) template.HTML { // the chart's room escapes every name
		return template.HTML(chart.SVG(c, id, chart.Size{Width: width, Height: height}))
	}
	return &page.Picture{Wide: svg("chart", 760, 280), Narrow: svg("small-chart", 370, 260), Text: chart.Text(c)}, nil
}

// evidenceOf is what explain says of a flag; nil where there is no such flag. Without weighing, the flag's own figures stand for it.
func evidenceOf(v watcher.View, ref uint64, weigh bool) (*page.Evidence, error) {
	r, err := watcher.NewReader(v)
	if err != nil {
		return nil, err
	}
	e, err := findExplained(r, []string{strconv.FormatUint(ref, 10)}, "")
	if err == nil && weigh {
		err = e.weigh(r)
	}
	var unknown *watcher.UnknownRef
	switch {
	case errors.As(err, &unknown):
		return nil, nil
	case err != nil:
		return nil, err
	}
	out := &page.Evidence{Flag: *e.flag}
	line := func(name, format string, args ...any) {
		out.Facts = append(out.Facts, page.Fact{Name: name, Text: fmt.Sprintf(format, args...)})
	}
	if e.flag.Series == "" {
		var text bytes.Buffer
		if err := (&app{out: &text}).explainFile(r, e.flag); err != nil {
			return nil, err
		}
		out.Title = text.String()
		return out, explainTurns(line, r, e.flag)
	}
	out.Title = e.headline()
	if !weigh {
		flagWeighing(line, e.flag)
	}
	return out, e.evidence(line, r)
}

// flagWeighing says what the weighing said when the flag was raised.
func flagWeighing(line func(name, format string, args ...any), f *rules.Flag) {
	if f.Reference != "" {
		line("reference", "%s returned %s; %s is left unexplained", printable(f.Reference), percentNum(f.ReferenceReturn), percentNum(f.Residual))
	}
	if f.LooksLike != "" {
		line("looks like", "%s (%s), %.1f %% if the day is not ordinary, a hypothesis", f.LooksLike.Words(), f.LooksLike, 100*f.Share.V)
	}
}
