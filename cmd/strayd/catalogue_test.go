package main

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"strayd/rules"
	"strayd/rules/drill"
)

// The catalogue is the forty kinds of error in daily return files that operations know. Each row is played through the real pass on an
// invented book, and ends in one of three ways: a flag about the value, with its cause where it has one (detected); a flag about the
// file, of which nothing or nothing wrong is taken (gated); or nothing, with the reason why nothing can be told (out of reach).
type catalogueRow struct {
	row  int
	what string
	end  ending
	why  string // where it is out of reach
	play func(c *catalogue)
}

type ending string

const (
	detected   ending = "detected"
	gated      ending = "gated"
	outOfReach ending = "out of reach"
)

// catalogueDays is how many dates the book has, of which the last are left for the rows.
const (
	catalogueDays = 290
	cataloguePast = 260
)

// catalogue is the folder of one row, its book, and the next date that has not come yet.
type catalogue struct {
	*folder
	book *drill.Book
	at   int
	file int // files sent so far
	from rules.Date
}

func TestCatalogue(t *testing.T) {
	if testing.Short() {
		t.Skip("forty books take a minute")
	}
	b := drill.Invent(drill.Invention{Seed: 40, Days: catalogueDays, FX: true})
	base := bookFolder(t, b)
	base.arriveAt(b, 0, cataloguePast, b.Dates[cataloguePast-1].String()+"T20:00:00Z")
	var rows []int
	for _, r := range catalogueRows() {
		rows = append(rows, r.row)
		t.Run(fmt.Sprintf("row %d: %s: %s", r.row, r.what, r.end), func(t *testing.T) {
			t.Parallel()
			if (r.end == outOfReach) != (r.why != "") {
				t.Errorf("ends %s, reason %q", r.end, r.why)
			}
			r.play(newCatalogue(t, base, b))
		})
	}
	slices.Sort(rows)
	if rows = slices.Compact(rows); len(rows) != 40 || rows[0] != 1 || rows[39] != 40 {
		t.Errorf("rows %v, want 1 to 40", rows)
	}
}

func newCatalogue(t *testing.T, base *folder, b *drill.Book) *catalogue {
	t.Helper()
	c := &catalogue{folder: &folder{t, t.TempDir()}, book: b.Clone(), at: cataloguePast, from: b.Dates[cataloguePast]}
	if err := os.Mkdir(filepath.Join(c.path, "inbox"), 0o755); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"strayd.yaml", "series.csv", "events.csv", "ledger.db"} {
		content, err := os.ReadFile(filepath.Join(base.path, name))
		if err != nil {
			t.Fatal(err)
		}
		c.write(name, string(content))
	}
	return c
}

// series is the index of a series.
func (c *catalogue) series(id string) int {
	c.t.Helper()
	i := slices.IndexFunc(c.book.Series, func(s drill.Series) bool { return s.ID == id })
	if i < 0 {
		c.t.Fatalf("no series %s", id)
	}
	return i
}

// value is a return of a series, days after the next date.
func (c *catalogue) value(id string, days int) *rules.Units {
	c.t.Helper()
	return &c.book.Values[c.at+days][c.series(id)]
}

// scaled multiplies a value that the next date has.
func (c *catalogue) scaled(id string, by rules.Units) { *c.value(id, 0) *= by }

// add adds hundredths of a per cent to a value, days after the next date.
func (c *catalogue) add(id string, days int, hundredths float64) {
	*c.value(id, days) += rules.Units(hundredths*100) * (rules.One / 1e6)
}

// come lets dates come as they are in the book, one pass a date.
func (c *catalogue) come(dates int) {
	c.t.Helper()
	for range dates {
		c.index()
		c.funds(c.text(c.at))
		c.pass("17:30", exitDone)
		c.at++
	}
}

// skip lets dates come in one file a feed.
func (c *catalogue) skip(dates int) {
	c.t.Helper()
	if dates > 0 {
		for _, feed := range []string{drill.BenchFeed, drill.FundsFeed} {
			text, _ := c.book.Text(feed, c.at, c.at+dates)
			c.write(c.name(feed), text)
		}
		c.at += dates - 1
		c.pass("17:30", exitDone)
		c.at++
	}
}

func (c *catalogue) name(feed string) string {
	c.file++
	return fmt.Sprintf("inbox/%s-%s-%d.csv", feed, c.book.Dates[c.at], c.file)
}

// text is the funds' file of a date.
func (c *catalogue) text(at int) string {
	text, _ := c.book.Text(drill.FundsFeed, at, at+1)
	return text
}

func (c *catalogue) index() {
	text, _ := c.book.Text(drill.BenchFeed, c.at, c.at+1)
	c.write(c.name(drill.BenchFeed), text)
}

func (c *catalogue) funds(text string) { c.write(c.name(drill.FundsFeed), text) }

// pass runs one pass at a time of the next date's day.
func (c *catalogue) pass(at string, want int) string {
	c.t.Helper()
	code, out, errs := c.try("pass", "--settled", "--now", c.book.Dates[c.at].String()+"T"+at+":00Z")
	if code != want {
		c.t.Fatalf("pass: exit code %d, want %d\n%s%s", code, want, out, errs)
	}
	return out + errs
}

// refused lets the next date's file of the funds come with another content, which must be refused with a flag that says a word.
func (c *catalogue) refused(text string, say string) {
	c.t.Helper()
	c.index()
	c.funds(text)
	c.pass("17:30", exitFailed)
	c.flagged(record{"kind": "refused", "feed": drill.FundsFeed}, say)
	for _, f := range c.flags() {
		if f["series"] != "" && strings.Contains(f["file"], drill.FundsFeed) && f["date"] == c.book.Dates[c.at].String() {
			c.t.Errorf("a flag on a value beside the refused file: %v", f)
		}
	}
}

// flags are those raised since the row began.
func (c *catalogue) flags() (out []record) {
	c.t.Helper()
	for _, f := range c.list("flags", "--all") {
		if f["raised_at"][:10] >= c.from.String() {
			out = append(out, f)
		}
	}
	return out
}

// flagged wants a flag with the given columns, whose note has a word.
func (c *catalogue) flagged(want record, say string) {
	c.t.Helper()
	all := c.flags()
	for _, f := range all {
		fits := strings.Contains(f["note"], say)
		for column, value := range want {
			fits = fits && slices.Contains(strings.Split(value, "|"), f[column])
		}
		if fits {
			return
		}
	}
	var have []string
	for _, f := range all {
		have = append(have, fmt.Sprintf("%s %s %s %s %s %s: %s", f["date"], f["series"], f["feed"], f["kind"], f["return"], f["looks_like"], f["note"]))
	}
	c.t.Errorf("no flag with %v and %q in its note; flags:\n%s", want, say, strings.Join(have, "\n"))
}

// quiet wants no flag on a value of a series. The weekly checks look at stretches, and may say something of any of them by chance.
func (c *catalogue) quiet(id string) {
	c.t.Helper()
	for _, f := range c.flags() {
		if f["series"] == id && !rules.Kind(f["kind"]).Slow() {
			c.t.Errorf("flagged: %s %s %s: %s", f["date"], f["kind"], f["looks_like"], f["note"])
		}
	}
}

// large lets dates come until one on which a series returns more than a size, in hundredths of a per cent.
func (c *catalogue) large(id string, hundredths float64) {
	c.t.Helper()
	s, days := c.series(id), 0
	for ; c.at+days < catalogueDays-6; days++ {
		if v := c.book.Values[c.at+days][s].Float() * 1e4; v > hundredths || v < -hundredths {
			c.skip(days)
			return
		}
	}
	c.t.Fatalf("no date on which %s returns over %v hundredths of a per cent", id, hundredths)
}

// list puts an event into the calendar for the next date.
func (c *catalogue) event(id, kind, amount string) {
	c.t.Helper()
	content, err := os.ReadFile(filepath.Join(c.path, "events.csv"))
	if err != nil {
		c.t.Fatal(err)
	}
	c.write("events.csv", fmt.Sprintf("%s%s,%s,%s,%s\n", content, c.book.Dates[c.at], id, kind, amount))
}

// reprint rounds what a change left to what the series prints.
func (c *catalogue) reprint(id string, days int, r float64) {
	s := c.series(id)
	tick := float64(c.book.Series[s].Tick)
	*c.value(id, days) = rules.Units(int64(r*1e15/tick)) * c.book.Series[s].Tick
}
