package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// weigher goes forward by date over the series that are weighed together. A causes.Pool is one.
type weigher interface {
	Step(causes.Day) *causes.Result
}

func newPool(members []causes.Member, groups []string, doubtful float64) weigher {
	return causes.NewPool(members, groups, doubtful)
}

// crew is the series that are weighed together: all that have a group, a reference or a currency, and those that they name.
type crew struct {
	members []causes.Member
	series  []uint32         // number of each member, ascending
	at      map[uint32]int32 // the member of a series
	groups  []string
	blocks  []uint32 // in which there are members, ascending
}

// newCrew finds the members among the names held. It is nil when there is none.
func newCrew(names *Names, m *rules.Membership, s *rules.Settings) *crew {
	events := s.Events
	if m.Lone() && len(events) == 0 {
		return nil
	}
	c := &crew{at: map[uint32]int32{}}
	var group, reference, currency []string
	named := m.Held()
	for _, e := range events {
		named[e.Series] = true
	}
	all := make([]string, names.Len())
	for id := range uint32(names.Len()) {
		name := string(names.Name(id))
		g := m.Group(name)
		all[id] = name
		group, reference, currency = append(group, g), append(reference, m.Reference(name, g)), append(currency, m.Currency(name))
	}
	for id, name := range all {
		if group[id] != "" || reference[id] != "" || currency[id] != "" || named[name] {
			c.at[uint32(id)] = int32(len(c.series))
			c.series = append(c.series, uint32(id))
		}
	}
	c.groups = distinct(group)
	for _, id := range c.series {
		c.members = append(c.members, c.member(names, all[id], group[id], reference[id], currency[id]))
		c.members[len(c.members)-1].Calendar = s.CalendarFor(all[id])
		if block := id / BlockSize; len(c.blocks) == 0 || c.blocks[len(c.blocks)-1] != block {
			c.blocks = append(c.blocks, block)
		}
	}
	c.addEvents(names, events)
	return c
}

// distinct lists the words that are there, in order.
func distinct(words []string) []string {
	words = slices.Clone(words)
	slices.Sort(words)
	words = slices.Compact(words)
	if len(words) > 0 && words[0] == "" {
		words = words[1:]
	}
	return words
}

func (c *crew) member(names *Names, name, group, reference, currency string) causes.Member {
	m := causes.Member{ID: name, Group: -1, FX: c.numbered(names, currency)}
	if at, ok := slices.BinarySearch(c.groups, group); ok {
		m.Group = at
	}
	if reference == rules.PeersReference {
		m.Reference.Kind = causes.Peers
	} else if at := c.numbered(names, reference); at >= 0 {
		m.Reference = causes.Reference{Kind: causes.Series, Series: at}
	}
	return m
}

// numbered is the member of a name, -1 when the ledger has no such series.
func (c *crew) numbered(names *Names, name string) int {
	if name == "" {
		return -1
	}
	id, ok := names.Find([]byte(name))
	if !ok {
		return -1
	}
	return int(c.at[id])
}

func (c *crew) addEvents(names *Names, events []rules.Event) {
	for _, e := range events {
		id, ok := names.Find([]byte(e.Series))
		if !ok {
			continue
		}
		if at, ok := c.at[id]; ok {
			c.members[at].Events = append(c.members[at].Events, e)
		}
	}
	for n := range c.members {
		slices.SortStableFunc(c.members[n].Events, func(a, b rules.Event) int { return cmp.Compare(a.Date, b.Date) })
	}
}

// in lists the members of a run of series: from the first of them to before the last.
func (c *crew) in(t task) (from, to int) {
	from, _ = slices.BinarySearch(c.series, t.series(0))
	to, _ = slices.BinarySearch(c.series, t.series(t.width))
	return from, to
}

// same says that two crews are weighed alike, so that the state of one serves the other.
func (c *crew) same(o *crew) bool {
	return slices.Equal(c.series, o.series) && slices.Equal(c.groups, o.groups) && slices.EqualFunc(c.members, o.members, sameMember)
}

func sameMember(a, b causes.Member) bool {
	return a.ID == b.ID && a.Group == b.Group && a.Reference == b.Reference && a.FX == b.FX && slices.Equal(a.Events, b.Events) &&
		a.Calendar.Same(b.Calendar)
}
