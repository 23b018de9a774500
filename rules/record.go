package rules

import (
	"cmp"
	"crypto/sha256"
	"encoding/json"
	"fmt"
	"slices"
)

// Text is the canonical form under which settings are recorded: settings that judge alike give equal bytes, whatever the order
// of a set or the spelling of a line.
func (s *Settings) Text() []byte {
	c := *s
	c.Ranges, c.Groups = nil, nil
	for _, r := range s.Ranges {
		c.Ranges = append(c.Ranges, canonical(r))
	}
	for _, g := range s.Groups {
		c.Groups = append(c.Groups, Group{Name: g.Name, Series: ordered(g.Series), Reference: g.Reference})
	}
	c.Events = slices.SortedFunc(slices.Values(s.Events), compareEvents)
	return encode(c)
}

func compareEvents(a, b Event) int {
	return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Series, b.Series), cmp.Compare(a.Kind, b.Kind), cmp.Compare(a.Amount, b.Amount))
}

// canonical leaves out what a range does not use.
func canonical(r Range) Range {
	r.For = ordered(r.For)
	if r.Scale != Weighted {
		r.Decay = 0
	}
	if r.Scale != Plain || r.Tail.Name == "predictive-t" {
		r.Predictive = false
	}
	if r.Limit != nil {
		return Range{Name: r.Name, For: r.For, Limit: r.Limit}
	}
	return r
}

func ordered(set []string) []string {
	out := slices.Clone(set)
	slices.Sort(out)
	return out
}

func encode(v any) []byte {
	text, err := json.Marshal(v)
	if err != nil {
		panic(err) // finite numbers, strings and lists only
	}
	return text
}

// ParseSettings reads a recorded settings text. Predictive and decay come back only where the range uses them.
func ParseSettings(text []byte) (*Settings, error) {
	s := new(Settings)
	if err := json.Unmarshal(text, s); err != nil {
		return nil, fmt.Errorf("recorded settings: %w", err)
	}
	return s, nil
}

// Identity is the text that tells one definition of a range's windows from another: all that decides which used values they
// take. Ranges that differ only in name, in whom they judge or in the watch line share it.
func (s *Settings) Identity(n int) string {
	r := canonical(s.Ranges[n])
	r.Name, r.For, r.Watch = "", nil, Line{}
	by := struct {
		Range   Range
		Limits  []Range // a value without lines of its own is clipped to them
		Groups  []Group // whom they judge
		Members [32]byte
		Days    *[32]byte `json:",omitempty"` // the calendars, where one is not plain: they say when a series is dormant
		Against *[32]byte `json:",omitempty"` // of residuals: what they are taken against
	}{Range: r}
	if r.Of == Residual && r.Limit == nil {
		against := Settings{References: s.References, Currencies: s.Currencies, Assigned: s.Assigned}
		for _, g := range s.Groups {
			against.Groups = append(against.Groups, Group{Name: g.Name, Series: ordered(g.Series), Reference: g.Reference})
		}
		sum := sha256.Sum256(encode(against))
		by.Against = &sum
	}
	if len(s.Calendars) > 0 {
		days := sha256.Sum256(encode(Settings{Calendar: s.Calendar, Calendars: s.Calendars, CalendarOf: s.CalendarOf}))
		by.Days = &days
	}
	for _, l := range s.Ranges {
		if l.Limit == nil {
			continue
		}
		by.Limits = append(by.Limits, Range{For: ordered(l.For), Limit: l.Limit})
		if len(l.For) > 0 && by.Groups == nil {
			by.Members = sha256.Sum256(encode(s.Assigned))
			for _, g := range s.Groups {
				by.Groups = append(by.Groups, Group{Name: g.Name, Series: ordered(g.Series)})
			}
		}
	}
	return string(encode(by))
}
