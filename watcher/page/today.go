package page

import (
	"html/template"
	"net/http"
	"strings"
	"sync"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// today keeps what the first page says of the ledger, until a step or a day makes it old.
type today struct {
	mu   sync.Mutex
	step uint32
	day  rules.Date
	held *dayFacts

	rows   template.HTML // the groups, written
	facts  *dayFacts     // that they are of
	minute time.Time     // that they were written in: they say how long until a release
}

// todayPage is the first page.
type todayPage struct {
	Now      time.Time
	Date     rules.Date
	Checked  int
	Due      int
	Missing  []string
	More     int // missing series that are not named
	Asking   int // flags
	Second   int // of which for a second person
	Feeds    []feedToday
	Groups   template.HTML
	Troubles []string
	Head     string
}

func (p *Page) showToday(v *visit) error {
	var body *todayPage
	err := p.reading(func(view watcher.View) (err error) {
		body, err = p.readToday(view, v.r.URL.Query().Get("all"))
		return err
	})
	if err != nil {
		return err
	}
	return v.show(http.StatusOK, "today", "Today", "today", body, v.desk.hear())
}

// readToday makes the first page; all is the group whose lines are shown to the last.
func (p *Page) readToday(view watcher.View, all string) (*todayPage, error) {
	book, now := p.src.Book(), p.src.Now()
	day := rules.DateFrom(now.In(book.Zone))
	facts, err := p.today.read(view, day, startOf(now.In(book.Zone)))
	if err != nil {
		return nil, err
	}
	out := &todayPage{Now: now.In(book.Zone), Date: facts.newest, Checked: facts.checked, Due: facts.due, Missing: facts.missing, Asking: len(facts.flags),
		Troubles: book.Troubles, Head: facts.head}
	out.More = max(0, facts.due-facts.checked-len(facts.missing))
	for i := range facts.flags {
		if facts.flags[i].AwaitsSecond() {
			out.Second++
		}
	}
	for i := range book.Feeds {
		out.Feeds = append(out.Feeds, feedOf(&book.Feeds[i], facts.feeds[book.Feeds[i].Name], now, book.Zone))
	}
	out.Groups, err = p.groups(facts, &book, now, all)
	return out, err
}

// groups writes the groups, or gives what was written in the same minute of the same facts: with a thousand flags that is most of the work.
func (p *Page) groups(facts *dayFacts, book *Book, now time.Time, all string) (template.HTML, error) {
	t := &p.today
	t.mu.Lock()
	defer t.mu.Unlock()
	minute := now.Truncate(time.Minute)
	if all == "" && t.facts == facts && t.minute.Equal(minute) {
		return t.rows, nil
	}
	day := rules.DateFrom(now.In(book.Zone))
	groups := groupsOf(facts.flags, book, now, day)
	for n := range groups {
		g := &groups[n]
		if len(g.Lines) > mostLines && all != g.Name {
			g.More = len(g.Lines) - mostLines
			g.Lines = g.Lines[:mostLines]
		}
		for i := range g.Lines {
			g.Lines[i].say(book, day)
		}
	}
	var b strings.Builder
	if err := p.pages["today"].ExecuteTemplate(&b, "groups", groups); err != nil {
		return "", err
	}
	rows := template.HTML(b.String()) // written by a template, which escapes
	if all == "" {
		t.rows, t.facts, t.minute = rows, facts, minute
	}
	return rows, nil
}
