package main

import (
	"fmt"
	"maps"
	"slices"

	"strayd/config"
	"strayd/rules"
	"strayd/watcher"
)

// sayStrangers names what the configuration and the register call by a name that nothing has: a group in a channel or a range, the pattern of
// a range or a group, the series of a reference. It says nothing while no series is known, and a name may yet come: these are no errors.
func (a *app) sayStrangers(c *config.Config, names *watcher.Names) error {
	s, _, err := settings(c)
	if err != nil || names.Len() == 0 {
		return err
	}
	list, err := strangers(&s, c.Channels, names)
	if err != nil || len(list) == 0 {
		return err
	}
	fmt.Fprintf(a.out, "\nNames that nothing has, among the groups and the %s known; are they mistyped?\n", rules.Counted(names.Len(), "series"))
	for _, l := range list {
		fmt.Fprintln(a.out, "  "+l)
	}
	return nil
}

// strangers lists where such names stand.
func strangers(s *rules.Settings, channels []rules.Channel, names *watcher.Names) (list []string, err error) {
	groups := map[string]bool{}
	for _, g := range s.Groups {
		groups[g.Name] = true
	}
	for _, group := range s.Assigned {
		groups[group] = true
	}
	look := func(where string, texts []string, series bool) {
		for _, text := range texts {
			if groups[text] && series || err != nil {
				continue
			}
			var fits bool
			if fits, err = anyFits(text, names); !fits && err == nil {
				list = append(list, fmt.Sprintf("%s: %q fits no series", where, text)+also(series))
			}
		}
	}
	for _, r := range s.Ranges {
		look("range "+r.Name+", for", r.For, true)
	}
	for _, g := range s.Groups {
		look("group "+g.Name+", series", g.Series, false)
		if _, known := names.Find([]byte(g.Reference)); !known && isSeries(g.Reference) {
			list = append(list, fmt.Sprintf("group %s, reference: no series %q", g.Name, g.Reference))
		}
	}
	for _, ch := range channels {
		for _, group := range ch.For {
			if !groups[group] {
				list = append(list, fmt.Sprintf("channel %s, for: no group %q", ch.Name, group))
			}
		}
	}
	return append(list, strangeReferences(s, names)...), err
}

// strangeReferences are the register's references that are no series, each once.
func strangeReferences(s *rules.Settings, names *watcher.Names) (list []string) {
	seen := map[string]bool{}
	for _, id := range slices.Sorted(maps.Keys(s.References)) {
		ref := s.References[id]
		if _, known := names.Find([]byte(ref)); !known && isSeries(ref) && !seen[ref] {
			seen[ref] = true
			list = append(list, fmt.Sprintf("register, reference of %s: no series %q", id, ref))
		}
	}
	return list
}

func isSeries(reference string) bool {
	return reference != "" && reference != rules.PeersReference && reference != rules.NoReference
}

func also(group bool) string {
	if group {
		return " and is no group"
	}
	return ""
}

// anyFits says whether a pattern fits the name of any series.
func anyFits(text string, names *watcher.Names) (bool, error) {
	p, err := rules.NewPattern(text)
	if err != nil {
		return false, err
	}
	for id := range uint32(names.Len()) {
		if p.Match(string(names.Name(id))) {
			return true, nil
		}
	}
	return false, nil
}
