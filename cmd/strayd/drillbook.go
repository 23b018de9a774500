package main

import (
	"fmt"

	"strayd/config"
	"strayd/rules"
	"strayd/rules/drill"
	"strayd/watcher"
)

// mostCells is how many values a drill holds in memory at most.
const mostCells = 40_000_000

// heldBook is the newest part of what the ledger holds as a book that errors can be planted in: the returns of the last dates, whatever
// feed or price they come from, with groups, references, currencies and events as the settings have them.
func heldBook(v watcher.View, s rules.Settings, dates int, only []rules.Pattern) (*drill.Book, error) {
	names, err := v.Names()
	if err != nil {
		return nil, err
	}
	members, err := rules.NewMembership(&s)
	if err != nil {
		return nil, err
	}
	all, err := v.Dates(watcher.Returns)
	if err != nil {
		return nil, err
	}
	b := &drill.Book{Dates: all[max(0, len(all)-dates):], Events: s.Events}
	ids := chosen(names, members, only)
	if len(ids) == 0 && len(only) > 0 {
		return nil, usagef("--for: no series or group of that name is held")
	}
	if cells := len(ids) * len(b.Dates); cells > mostCells {
		return nil, fmt.Errorf("%s on %s are more than the %s values that a drill holds: narrow it with --for", rules.Counted(len(ids), "series"),
			rules.Counted(len(b.Dates), "date"), rules.Thousands(mostCells))
	}
	for _, id := range ids {
		b.Series = append(b.Series, drill.Series{ID: string(names.Name(id)), Reference: -1, FX: -1})
	}
	if err := fillBook(v, b, ids, names.Len()); err != nil {
		return nil, err
	}
	tie(b, members)
	return b, feedsOf(v, b, ids)
}

// chosen are the series of a drill with the benchmarks and currencies that they need.
func chosen(names *watcher.Names, members *rules.Membership, only []rules.Pattern) (ids []uint32) {
	wanted := make([]bool, names.Len())
	want := func(id string) {
		if n, ok := names.Find([]byte(id)); ok && id != "" {
			wanted[n] = true
		}
	}
	for n := range wanted {
		id := string(names.Name(uint32(n)))
		group := members.Group(id)
		if len(only) == 0 || fitsAny(only, id) || fitsAny(only, group) {
			wanted[n] = true
			want(members.Reference(id, group))
			want(members.Currency(id))
		}
	}
	for n, is := range wanted {
		if is {
			ids = append(ids, uint32(n))
		}
	}
	return ids
}

func fitsAny(patterns []rules.Pattern, word string) bool {
	for _, p := range patterns {
		if p.Match(word) {
			return true
		}
	}
	return false
}

// fillBook reads the newest returns of the chosen series.
func fillBook(v watcher.View, b *drill.Book, ids []uint32, series int) error {
	for _, date := range b.Dates {
		all := make([]int64, series)
		for i := range all {
			all[i] = watcher.Missing64
		}
		for block := 0; block*watcher.BlockSize < series; block++ {
			from := block * watcher.BlockSize
			if _, err := v.Fill(watcher.Returns, date, uint32(block), 0, all[from:min(from+watcher.BlockSize, series)]); err != nil {
				return err
			}
		}
		row := make([]rules.Units, len(ids))
		for i, id := range ids {
			row[i] = rules.Missing
			if u := all[id]; u != watcher.Missing64 {
				row[i] = rules.Units(u)
			}
		}
		b.Values = append(b.Values, row)
	}
	return nil
}

// tie gives each series its group, what it is held against, and how it prints.
func tie(b *drill.Book, members *rules.Membership) {
	at := map[string]int{}
	for i := range b.Series {
		at[b.Series[i].ID] = i
	}
	index := func(id string) int {
		if i, ok := at[id]; ok {
			b.Series[i].Helper = true
			return i
		}
		return -1
	}
	for i := range b.Series {
		s := &b.Series[i]
		s.Group = members.Group(s.ID)
		if r := members.Reference(s.ID, s.Group); r == rules.PeersReference {
			s.Peers = true
		} else {
			s.Reference = index(r)
		}
		s.FX = index(members.Currency(s.ID))
		values := make([]rules.Units, len(b.Dates))
		for t := range values {
			values[t] = b.Values[t][i]
		}
		s.Tick = drill.TickOf(values)
	}
}

// feedsOf finds the feed that brought the newest value of each series.
func feedsOf(v watcher.View, b *drill.Book, ids []uint32) error {
	brought := map[uint32]uint32{} // series to step
	for t := len(b.Dates) - 1; t >= 0 && len(brought) < len(ids); t-- {
		if err := broughtOn(v, b.Dates[t], ids, brought); err != nil {
			return err
		}
	}
	feeds := map[uint32]string{}
	for i, id := range ids {
		step, ok := brought[id]
		if _, known := feeds[step]; ok && !known {
			row, err := v.File(step)
			if err != nil {
				return err
			}
			feeds[step] = row.File.Feed
		}
		b.Series[i].Feed = feeds[step]
	}
	return nil
}

// broughtOn notes, for the series without a step so far, the step that wrote their newest value on a date.
func broughtOn(v watcher.View, date rules.Date, ids []uint32, brought map[uint32]uint32) error {
	for from := 0; from < len(ids); {
		block := ids[from] / watcher.BlockSize
		upto := from
		for upto < len(ids) && ids[upto]/watcher.BlockSize == block {
			upto++
		}
		found := map[uint32]uint32{}
		err := v.Layers(watcher.Returns, date, block, func(step uint32, vals []int64) error {
			for _, id := range ids[from:upto] {
				if at := int(id % watcher.BlockSize); at < len(vals) && vals[at] != watcher.Missing64 {
					found[id] = step
				}
			}
			return nil
		})
		if err != nil {
			return err
		}
		for id, step := range found {
			if _, ok := brought[id]; !ok {
				brought[id] = step
			}
		}
		from = upto
	}
	return nil
}

// feedsIn keeps to the feeds that the configuration has: a series whose feed is gone goes with the first.
func feedsIn(b *drill.Book, c *config.Config) {
	for i := range b.Series {
		if c.FeedKey(b.Series[i].Feed) == "" {
			b.Series[i].Feed = c.Feeds[0].Name
		}
	}
}
