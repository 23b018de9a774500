package page

import (
	"cmp"
	"math"
	"slices"
	"strings"
	"time"

	"strayd/rules"
)

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
