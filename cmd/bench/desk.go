package main

import (
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/http/cookiejar"
	"net/url"
	"os"
	"regexp"
	"slices"
	"strings"
	"time"
)

const (
	deskSeries = 10_000
	deskDates  = 250
	deskFlags  = 1000 // open ones, at least
	perGroup   = 100  // series of a group, by their names
	deskAsks   = 200  // of each page
)

// pages measures the desk's page of a book with many open flags while passes run one after another: from asking to the last byte.
func (b *bench) pages() error {
	d, err := b.newDesk(`, schedule: "0 3 1 1 *"`)
	if err != nil {
		return err
	}
	if err := d.group(b.share(deskSeries)); err != nil {
		return err
	}
	if err := d.fresh(); err != nil {
		return err
	}
	if err := d.fill(b.share(deskSeries), 0, deskDates); err != nil {
		return err
	}
	r, err := d.runDaemon()
	if err != nil {
		return err
	}
	defer r.cmd.Process.Kill()    //nolint:errcheck // where an error leaves it running
	go io.Copy(io.Discard, r.out) //nolint:errcheck // until it ends
	if err := d.stray(b.share(deskSeries)); err != nil {
		return err
	}
	flags, _, err := d.output("flags", "--format", "csv")
	if err != nil {
		return err
	}
	refs := strings.Split(strings.TrimSpace(flags), "\n")[1:]
	stop := d.passes(b.share(deskSeries))
	measured := b.askPages(d, refs)
	passes, err := stop()
	if err := errors.Join(measured, err); err != nil {
		return err
	}
	fmt.Printf("%d series, %d open flags, %d passes of one day meanwhile\n", b.share(deskSeries), len(refs), passes)
	if _, err := r.end(); err != nil {
		return err
	}
	return os.RemoveAll(d.dir)
}

// askPages asks for each page in turn and prints the medians and what 19 of 20 stay under.
func (b *bench) askPages(d *desk, refs []string) error {
	v, err := d.visit()
	if err != nil {
		return err
	}
	for _, page := range []struct {
		name string
		path func(n int) string
	}{
		{"today", func(int) string { return "" }},
		{"a flag", func(n int) string {
			ref, _, _ := strings.Cut(refs[n*37%len(refs)], ",")
			return "flag?ref=" + ref
		}},
		{"a series", func(n int) string { return "series?name=" + string(name(nil, n*37%b.share(deskSeries))) }},
		{"feeds", func(int) string { return "feeds" }},
	} {
		took := make([]usage, 0, deskAsks)
		for n := range deskAsks {
			begun := time.Now()
			if err := v.ask(page.path(n)); err != nil {
				return err
			}
			took = append(took, usage{wall: time.Since(begun)})
		}
		slices.SortFunc(took, func(a, b usage) int { return int(a.wall - b.wall) })
		b.print(figures{row: "desk", work: page.name, usage: usage{wall: wallOf(took)}})
		b.print(figures{row: "desk", work: page.name + ", 95 %", usage: usage{wall: took[len(took)*19/20].wall}})
	}
	return nil
}

// group puts the series into groups of a hundred.
func (d *desk) group(series int) error {
	f, err := os.OpenFile(d.path("strayd.yaml"), os.O_APPEND|os.O_WRONLY, 0)
	if err != nil {
		return err
	}
	defer f.Close()
	fmt.Fprintln(f, "groups:")
	for n := 0; n < series; n += perGroup {
		id := string(name(nil, n))
		fmt.Fprintf(f, "  - {name: g%s, series: [\"%s*\"], release: {at: \"11:00\", days: 1}}\n", id, id[:len(id)-2])
	}
	return f.Close()
}

// stray has a day read on which every tenth series, or more where they are few, is far out.
func (d *desk) stray(series int) error {
	every := max(1, series/deskFlags)
	var s strings.Builder
	s.WriteString("date,series,return\n")
	for n := range series {
		v := value(n, deskDates)
		if n%every == 0 {
			v = 20e6 + int64(n)
		}
		s.Write(append(decimal(append(name(append([]byte(day(deskDates).Format(time.DateOnly)), ','), n), ','), v), '\n'))
	}
	if err := d.empty(); err != nil {
		return err
	}
	if err := os.WriteFile(d.path("inbox/stray.csv"), []byte(s.String()), 0o644); err != nil {
		return err
	}
	_, err := d.run("pass", "--settled")
	return err
}

// passes has days read one after another until it is stopped.
func (d *desk) passes(series int) (stop func() (int, error)) {
	end, done := make(chan struct{}), make(chan error, 1)
	n := 0
	go func() {
		for {
			select {
			case <-end:
				done <- nil
				return
			default:
			}
			n++
			if err := d.deliver(fmt.Sprintf("day-%d.csv", n), book{series: series, from: deskDates + n, dates: 1}); err != nil {
				done <- err
				return
			}
			if _, err := d.run("pass", "--settled"); err != nil {
				done <- err
				return
			}
		}
	}()
	return func() (int, error) { close(end); err := <-done; return n, err }
}

// visitor is a person at the desk's page.
type visitor struct {
	http *http.Client
	root string
}

func (d *desk) visit() (*visitor, error) {
	out, _, err := d.output("desk", "--print")
	if err != nil {
		return nil, err
	}
	link := regexp.MustCompile(`^(http://[^/]+)/enter\?link=(\S+)`).FindStringSubmatch(out)
	if link == nil {
		return nil, fmt.Errorf("no link in %q", out)
	}
	jar, err := cookiejar.New(nil)
	if err != nil {
		return nil, err
	}
	v := &visitor{http: &http.Client{Jar: jar}}
	res, err := v.http.PostForm(link[1]+"/enter", url.Values{"link": {link[2]}})
	if err != nil {
		return nil, err
	}
	v.root = res.Request.URL.String()
	return v, res.Body.Close()
}

func (v *visitor) ask(path string) error {
	res, err := v.http.Get(v.root + path)
	if err != nil {
		return err
	}
	defer res.Body.Close()
	if _, err = io.Copy(io.Discard, res.Body); err == nil && res.StatusCode != http.StatusOK {
		err = fmt.Errorf("%s: %s", path, res.Status)
	}
	return err
}
