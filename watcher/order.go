package watcher

import (
	"slices"

	"strayd/rules"
)

// lookedBack is how many of the newest dates held are looked through for a reference's value.
const lookedBack = 10

// inOrder lists the feeds in the order in which a pass takes them: first those that brought the newest values of what others are held
// against, so that a reference is there when its followers are judged.
func (p *Pass) inOrder() ([]rules.Feed, error) {
	members, err := rules.NewMembership(&p.Settings)
	if err != nil || len(p.Feeds) < 2 || members.Lone() {
		return p.Feeds, err
	}
	v, err := p.Store.View()
	if err != nil {
		return nil, err
	}
	defer v.Close()
	dates, err := v.Dates(Returns)
	if err != nil {
		return nil, err
	}
	dates = dates[max(0, len(dates)-lookedBack):]
	first := map[string]bool{}
	for name := range members.Held() {
		id, ok := p.names.Find([]byte(name))
		if !ok {
			continue
		}
		feed, err := feedOf(v, dates, id)
		if err != nil {
			return nil, err
		}
		first[feed] = true
	}
	feeds := slices.Clone(p.Feeds)
	slices.SortStableFunc(feeds, func(a, b rules.Feed) int {
		switch {
		case first[a.Name] && !first[b.Name]:
			return -1
		case first[b.Name] && !first[a.Name]:
			return 1
		}
		return 0
	})
	return feeds, nil
}

// feedOf is the feed that brought the newest value of a series on some dates, "" for none.
func feedOf(v View, dates []rules.Date, id uint32) (string, error) {
	for _, d := range slices.Backward(dates) {
		steps, err := versionSteps(v, d, id/BlockSize, []int{int(id % BlockSize)})
		if err != nil {
			return "", err
		}
		if steps[0] == 0 {
			continue
		}
		row, err := v.File(steps[0])
		return row.File.Feed, err
	}
	return "", nil
}
