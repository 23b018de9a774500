package rules

import (
	"path"
	"strings"
)

// Pattern is an id or a glob (path.Match), prepared so that the usual forms are one comparison.
type Pattern struct {
	text string
	form form
}

type form uint8

const (
	literal form = iota
	prefix       // "alder-*"
	glob
)

// NewPattern prepares an id or glob. A malformed glob gives path.ErrBadPattern.
func NewPattern(s string) (Pattern, error) {
	if _, err := path.Match(s, ""); err != nil {
		return Pattern{}, err
	}
	switch i := strings.IndexAny(s, `*?[\`); {
	case i < 0:
		return Pattern{s, literal}, nil
	case i == len(s)-1 && s[i] == '*' && !strings.Contains(s, "/"):
		return Pattern{s[:i], prefix}, nil
	}
	return Pattern{s, glob}, nil
}

// Match says whether a series id fits. As in path.Match, * stops at a slash.
func (p Pattern) Match(id string) bool {
	switch p.form {
	case literal:
		return id == p.text
	case prefix:
		return strings.HasPrefix(id, p.text) && !strings.Contains(id[len(p.text):], "/")
	}
	ok, err := path.Match(p.text, id)
	return ok && err == nil
}

// Settings is everything that decides a verdict, apart from the returns themselves.
type Settings struct {
	Ranges   []Range
	Groups   []Group
	Doubtful float64
	Calendar string // name of the calendar of all series but those of CalendarOf
	// Calendars are the business days of each calendar that is not simply Monday to Friday, by name; CalendarOf names that of each
	// series whose register row has one.
	Calendars  map[string]*Calendar `json:",omitempty"`
	CalendarOf map[string]string    `json:",omitempty"`
	// Assigned is the group of each series that the register puts into one: part of the settings, so that a verdict of the past
	// is explained by the groups of then.
	Assigned map[string]string `json:",omitempty"`
	// References names the reference of each series of which the register names one: a series, "peers" or "none".
	References map[string]string `json:",omitempty"`
	// Currencies names for a series the one whose return is that of its foreign currency.
	Currencies map[string]string `json:",omitempty"`
	// Lives says from when to when a series is expected, where the register does.
	Lives  map[string]Life `json:",omitempty"`
	Events []Event         `json:",omitempty"`
}

// Register takes over what the register says of its series.
func (s *Settings) Register(register []Series) {
	s.Assigned, s.References, s.Currencies, s.Lives = map[string]string{}, map[string]string{}, map[string]string{}, map[string]Life{}
	s.CalendarOf = map[string]string{}
	set := func(m map[string]string, id, value string) {
		if value != "" {
			m[id] = value
		}
	}
	for _, r := range register {
		set(s.Assigned, r.ID, r.Group)
		set(s.References, r.ID, r.Reference)
		set(s.Currencies, r.ID, r.FX)
		set(s.CalendarOf, r.ID, r.Calendar)
		if r.Start != NoDate || r.End != NoDate {
			s.Lives[r.ID] = Life{r.Start, r.End}
		}
	}
}

// Expects says whether a series is expected to have a value on a date: a business day of its calendar, within its life.
func (s *Settings) Expects(series string, d Date) bool {
	life, known := s.Lives[series]
	return (!known || d >= life.Start && (life.End == NoDate || d <= life.End)) && s.CalendarFor(series).Business(d)
}

// Life is the first and the last date on which a series is expected, NoDate where it is open.
type Life struct{ Start, End Date }

// Membership answers, for a series id, its group and the ranges that judge it.
type Membership struct {
	groups   []memberGroup
	register map[string]string // id to group, where the register names one
	ranges   []memberRange

	references, currencies map[string]string
}

type memberGroup struct {
	name      string
	of        []Pattern
	reference string
}

type memberRange struct {
	all    bool
	groups map[string]bool
	ids    []Pattern
}

// NewMembership prepares the settings' patterns. A malformed glob gives path.ErrBadPattern.
func NewMembership(s *Settings) (*Membership, error) {
	m := &Membership{}
	names := map[string]bool{}
	for _, g := range s.Groups {
		of, err := patterns(g.Series)
		if err != nil {
			return nil, err
		}
		m.groups = append(m.groups, memberGroup{g.Name, of, g.Reference})
		names[g.Name] = true
	}
	m.register, m.references, m.currencies = s.Assigned, s.References, s.Currencies
	for _, group := range s.Assigned {
		names[group] = true
	}
	for _, r := range s.Ranges {
		mr := memberRange{all: len(r.For) == 0, groups: map[string]bool{}}
		for _, f := range r.For {
			if names[f] {
				mr.groups[f] = true
				continue
			}
			p, err := NewPattern(f)
			if err != nil {
				return nil, err
			}
			mr.ids = append(mr.ids, p)
		}
		m.ranges = append(m.ranges, mr)
	}
	return m, nil
}

func patterns(texts []string) ([]Pattern, error) {
	var out []Pattern
	for _, t := range texts {
		p, err := NewPattern(t)
		if err != nil {
			return nil, err
		}
		out = append(out, p)
	}
	return out, nil
}

// Universal says that every range judges every series and no series has a group, so that nothing need be looked up.
func (m *Membership) Universal() bool {
	for _, r := range m.ranges {
		if !r.all {
			return false
		}
	}
	return m.Groupless()
}

// Groupless says that no series has a group.
func (m *Membership) Groupless() bool { return len(m.groups)+len(m.register) == 0 }

// Group is the group of a series: the register's where it names one, else the first whose patterns fit, else "".
func (m *Membership) Group(id string) string {
	if g, ok := m.register[id]; ok {
		return g
	}
	for _, g := range m.groups {
		if matchAny(g.of, id) {
			return g.name
		}
	}
	return ""
}

// The words for a reference that is not a series.
const (
	PeersReference = "peers" // the median of the group without the series itself
	NoReference    = "none"
)

// Reference is what the residual of a series of the given group is taken against: the id of another series, PeersReference, or "" for
// none.
func (m *Membership) Reference(id, group string) string {
	r, ok := m.references[id]
	for i := 0; !ok && group != "" && i < len(m.groups); i++ {
		if m.groups[i].name == group {
			r, ok = m.groups[i].reference, true
		}
	}
	if !ok && group != "" { // a group that only the register names
		r = PeersReference
	}
	if r == NoReference || r == id || r == PeersReference && group == "" {
		return ""
	}
	return r
}

// Held lists the series that others are held against: references and currencies.
func (m *Membership) Held() map[string]bool {
	out := map[string]bool{}
	for _, r := range m.references {
		out[r] = true
	}
	for _, g := range m.groups {
		out[g.reference] = true
	}
	for _, c := range m.currencies {
		out[c] = true
	}
	return out
}

// Currency is the series whose return is that of a series' foreign currency, "" for none.
func (m *Membership) Currency(id string) string {
	if c := m.currencies[id]; c != id {
		return c
	}
	return ""
}

// Lone says that no series has a group, a reference or a currency.
func (m *Membership) Lone() bool { return m.Groupless() && len(m.references)+len(m.currencies) == 0 }

// Applies says whether the range at an index of the settings judges a series of the given group.
func (m *Membership) Applies(rangeIndex int, id, group string) bool {
	r := &m.ranges[rangeIndex]
	return r.all || group != "" && r.groups[group] || matchAny(r.ids, id)
}

func matchAny(ps []Pattern, id string) bool {
	for _, p := range ps {
		if p.Match(id) {
			return true
		}
	}
	return false
}
