package page

import (
	"cmp"
	"html/template"
	"math"
	"net/http"
	"slices"
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

// dayFacts are what the first page reads from the ledger.
type dayFacts struct {
	flags   []rules.Flag // that ask something
	feeds   map[string]*arrival
	newest  rules.Date // on which anything is held, of those taken last
	checked int
	due     int
	missing []string
	head    string
}

// arrival is what came of one feed lately.
type arrival struct {
	file    watcher.FileRow // the last accepted
	refused int             // since the start of the day
	taken   int
}

// todayPage is the first page.
type todayPage struct {
	Now      time.Time
	Date     rules.Date
	Checked  int
	Due      int
	Missing  []string
	Asking   int // flags
	Second   int // of which for a second person
	Feeds    []feedToday
	Groups   template.HTML
	Troubles []string
	Head     string
}

// feedToday is one feed on the first page.
type feedToday struct {
	Name    string
	File    string
	At      time.Time
	Date    rules.Date
	Refused int
	Whole   bool // the date that fell due last has come
	Due     string
}

// groupToday is a group with what asks something of its people.
type groupToday struct {
	Name   string
	Title  string
	Owner  string
	Blocks string
	Past   bool // the release has passed
	Four   bool
	Lines  []line
	More   int

	release time.Time
}

// line is one series and date with its flags, in the words that the page shows: a page may have thousands.
type line struct {
	Ref      uint64 // the first
	Refs     string // all of them, with commas between
	Series   string // "" where it is about none
	What     string
	Kinds    string
	Date     string
	Return   string
	Marks    *marks
	Expected string
	Rare     string
	Looks    string
	Note     string
	Standing string

	flags []*rules.Flag
}

// mostLines is how many lines of one group the first page shows; the rest follows on request.
const mostLines = 250

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

// read gives what the page needs of the ledger, or gives what was read at the same step.
func (t *today) read(v watcher.View, day rules.Date, since time.Time) (*dayFacts, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	if t.held != nil && t.step == v.Step() && t.day == day {
		return t.held, nil
	}
	f := &dayFacts{feeds: map[string]*arrival{}, newest: rules.NoDate}
	if err := v.Flags(false, func(g rules.Flag) bool {
		if g.AsksOn(day) {
			f.flags = append(f.flags, g)
		}
		return true
	}); err != nil {
		return nil, err
	}
	if err := v.Files(func(row watcher.FileRow) bool { f.arrive(row, since); return true }); err != nil {
		return nil, err
	}
	var err error
	if f.newest != rules.NoDate {
		if f.checked, f.due, f.missing, err = watcher.Day(v, f.newest); err != nil {
			return nil, err
		}
	}
	if f.head, err = v.Head(); err != nil {
		return nil, err
	}
	t.held, t.step, t.day = f, v.Step(), day
	return f, nil
}

func (f *dayFacts) arrive(row watcher.FileRow, since time.Time) {
	if row.Fileless() {
		return
	}
	a := f.feeds[row.File.Feed]
	if a == nil {
		a = &arrival{}
		f.feeds[row.File.Feed] = a
	}
	switch {
	case row.Outcome == watcher.Accepted:
		a.file = row
		f.newest = max(f.newest, row.Last)
		if !row.Received.Before(since) {
			a.taken++
		}
	case !row.Received.Before(since):
		a.refused++
	}
}

func startOf(t time.Time) time.Time {
	y, m, d := t.Date()
	return time.Date(y, m, d, 0, 0, 0, 0, t.Location())
}

// zoneOf is the zone of a deadline.
func zoneOf(d *rules.Due, otherwise *time.Location) *time.Location {
	if zone, err := time.LoadLocation(d.Timezone); err == nil && d.Timezone != "" {
		return zone
	}
	return otherwise
}

func feedOf(f *rules.Feed, a *arrival, now time.Time, zone *time.Location) feedToday {
	out := feedToday{Name: f.Name, Date: rules.NoDate, Whole: true}
	if a != nil {
		out.File, out.At, out.Date, out.Refused = a.file.File.Name, a.file.Received, a.file.Last, a.refused
		if out.File == "" {
			out.Date = rules.NoDate
		}
	}
	if f.Due == nil {
		return out
	}
	at := zoneOf(f.Due, zone)
	next, when := rules.NextDue(*f.Due, now, at)
	last := lastDue(f.Due, now, at)
	out.Whole = out.Date >= last
	switch {
	case !out.Whole:
		out.Due = last.Day() + " is overdue since " + rules.DueAt(*f.Due, last, at).In(zone).Format("Mon 15:04")
	case out.Date >= next:
		out.Due = next.Day() + " is here"
	default:
		out.Due = next.Day() + " is due " + when.In(zone).Format("Mon 15:04")
	}
	return out
}

// lastDue is the date that fell due last.
func lastDue(d *rules.Due, now time.Time, zone *time.Location) rules.Date {
	dates := rules.DueBetween(*d, now.AddDate(0, 0, -14), now, zone)
	if len(dates) == 0 {
		return rules.NoDate
	}
	return dates[len(dates)-1]
}

// groupsOf sorts what asks something into groups: those whose release comes first stand first, then by name; without a group last.
func groupsOf(flags []rules.Flag, book *Book, now time.Time, day rules.Date) []groupToday {
	at := map[string]int{}
	var out []groupToday
	for i := range flags {
		f := &flags[i]
		n, ok := at[f.Group]
		if !ok {
			n = len(out)
			at[f.Group] = n
			out = append(out, newGroup(f.Group, book))
		}
		out[n].take(f)
	}
	for n := range out {
		out[n].finish(book, now)
	}
	slices.SortStableFunc(out, func(a, b groupToday) int {
		none := func(g groupToday) int { return map[bool]int{true: 1}[g.Name == ""] }
		return cmp.Or(cmp.Compare(none(a), none(b)), compareReleases(a.release, b.release), cmp.Compare(a.Name, b.Name))
	})
	return out
}

func compareReleases(a, b time.Time) int {
	switch {
	case a.IsZero() != b.IsZero():
		return map[bool]int{true: 1, false: -1}[a.IsZero()]
	default:
		return a.Compare(b)
	}
}

func newGroup(name string, book *Book) groupToday {
	g := groupToday{Name: name, Title: name}
	if name == "" {
		g.Title = "Files, and series without a group"
	}
	if known := groupIn(book, name); known != nil {
		g.Owner, g.Four = known.Owner, known.FourEyes
	}
	return g
}

func groupIn(book *Book, name string) *rules.Group {
	for i := range book.Groups {
		if book.Groups[i].Name == name && name != "" {
			return &book.Groups[i]
		}
	}
	return nil
}

// take puts a flag into its line: flags of one series and date share one. They lie beside each other.
func (g *groupToday) take(f *rules.Flag) {
	for n := len(g.Lines) - 1; n >= max(0, len(g.Lines)-8) && f.Series != ""; n-- {
		if first := g.Lines[n].flags[0]; first.Series == f.Series && first.Date == f.Date && first.Standing == f.Standing {
			g.Lines[n].flags = append(g.Lines[n].flags, f)
			return
		}
	}
	g.Lines = append(g.Lines, line{flags: []*rules.Flag{f}})
}

// say puts a line into words.
func (l *line) say(book *Book, day rules.Date) {
	f := l.flags[0]
	var refs []uint64
	var kinds []string
	for _, g := range l.flags {
		refs, kinds = append(refs, g.Ref), append(kinds, string(g.Kind))
	}
	l.Ref, l.Refs, l.Kinds = f.Ref, refWords(refs), strings.Join(kinds, ", ")
	l.Series, l.What, l.Note = f.Series, Safe(whatOf(f)), Safe(f.Note)
	l.Date, l.Return, l.Marks, l.Looks = dateWords(f.Date), unitWords(f.Return), newMarks(*f), looksWords(*f)
	l.Expected = rules.Between(f.Low, f.High)
	if f.Tail.OK {
		l.Rare = onceWords(f.Tail)
	}
	l.Standing = string(f.StandingOn(day))
	if f.AwaitsSecond() {
		l.Standing += ", waits for a second person"
	}
	if days := book.Business.Between(rules.DateFrom(f.RaisedAt.In(book.Zone)), day); days > 0 {
		l.Standing += " " + rules.Counted(days, "day")
	}
	if book.Owner != nil && f.Series != "" && book.Owner(f.Series) != "" {
		l.Standing += " · " + Safe(book.Owner(f.Series))
	}
}

// whatOf is what a flag is about.
func whatOf(f *rules.Flag) string {
	switch {
	case f.Series != "":
		return f.Series
	case f.Group != "":
		return "group " + f.Group
	case f.File != "":
		return f.Feed + ": " + f.File
	}
	return f.Feed
}

// finish orders the lines, the newest date first and on it the rarest, and says what they hold back.
func (g *groupToday) finish(book *Book, now time.Time) {
	slices.SortStableFunc(g.Lines, func(x, y line) int {
		a, b := x.flags[0], y.flags[0]
		return cmp.Or(cmp.Compare(b.Date, a.Date), cmp.Compare(rarity(a), rarity(b)), cmp.Compare(a.Ref, b.Ref))
	})
	known := groupIn(book, g.Name)
	if known == nil || known.Release == nil {
		return
	}
	zone := zoneOf(known.Release, book.Zone)
	for _, l := range g.Lines {
		f := l.flags[0]
		if f.Date == rules.NoDate || f.Kind.Slow() {
			continue
		}
		if at := rules.DueAt(*known.Release, f.Date, zone); g.release.IsZero() || at.Before(g.release) {
			g.release = at
		}
	}
	if g.release.IsZero() {
		return
	}
	when := g.release.In(book.Zone).Format("Mon 2 Jan 15:04")
	if g.Past = g.release.Before(now); g.Past {
		g.Blocks = "its release was " + when
	} else {
		g.Blocks = "holds back the release of " + when + ", in " + until(g.release.Sub(now))
	}
}

// rarity sorts what is not estimated first, then by the tail.
func rarity(f *rules.Flag) float64 {
	if !f.Log10.OK {
		return math.Inf(-1)
	}
	return f.Log10.V
}

// until says a time ahead in the two largest units.
func until(d time.Duration) string {
	d = d.Round(time.Minute)
	days, hours, minutes := int(d/(24*time.Hour)), int(d/time.Hour)%24, int(d/time.Minute)%60
	var parts []string
	for _, u := range []struct {
		n    int
		unit string
	}{{days, "day"}, {hours, "hour"}, {minutes, "minute"}} {
		if u.n > 0 && len(parts) < 2 {
			parts = append(parts, rules.Counted(u.n, u.unit))
		}
	}
	if len(parts) == 0 {
		return "less than a minute"
	}
	return strings.Join(parts, " ")
}
