package watcher

import (
	"cmp"
	"slices"

	"strayd/rules"
)

// Neighbours are the other series of a series' group on a date, by their returns.
type Neighbours struct {
	Group   string
	Held    int // how many of the group have a return on the date
	Lacking int // how many have none
	Median  rules.Num
	List    []Neighbour // by return, from the smallest; when they are many, the ends and the middle around the series itself
}

// Neighbour is one series of a group on a date.
type Neighbour struct {
	Series string
	Return rules.Units
	Itself bool
	Rank   int  // from 1
	Gap    bool // some are left out before it
}

// Neighbours lists at most so many series of a series' group (as its newest settings have it) with their newest returns of a date; nil for a
// series without a group.
func (r *Reader) Neighbours(series string, date rules.Date, most int) (*Neighbours, error) {
	last, err := r.View.LastSettings()
	if err != nil || last == 0 {
		return nil, err
	}
	set, err := r.settingsNumber(last)
	if err != nil {
		return nil, err
	}
	out := &Neighbours{Group: set.members.Group(series)}
	if out.Group == "" {
		return nil, nil
	}
	err = r.groupOn(out.Group, set, date, func(id uint32, value int64) {
		if value == Missing64 {
			out.Lacking++
			return
		}
		name := string(r.Names.Name(id))
		out.List = append(out.List, Neighbour{Series: name, Return: rules.Units(value), Itself: name == series})
	})
	if err != nil {
		return nil, err
	}
	slices.SortFunc(out.List, func(a, b Neighbour) int {
		return cmp.Or(cmp.Compare(a.Return, b.Return), cmp.Compare(a.Series, b.Series))
	})
	out.settle(most)
	return out, nil
}

// groupOn calls each with every series of a group and its return on a date, Missing64 where it has none.
func (r *Reader) groupOn(group string, set *recorded, date rules.Date, each func(id uint32, value int64)) error {
	for _, bl := range allBlocks(r.Names.Len(), rules.NoDate) {
		values := make([]int64, bl.series)
		fillMissing(values)
		if _, err := r.View.Fill(Returns, date, bl.number, 0, values); err != nil {
			return err
		}
		for i, value := range values {
			id := bl.number*BlockSize + uint32(i)
			if set.members.Group(string(r.Names.Name(id))) == group {
				each(id, value)
			}
		}
	}
	return nil
}

// settle ranks the list, takes the median and leaves out what is too much.
func (n *Neighbours) settle(most int) {
	n.Held = len(n.List)
	if n.Held == 0 {
		return
	}
	low, high := n.List[(n.Held-1)/2].Return.Float(), n.List[n.Held/2].Return.Float()
	n.Median = rules.Some(low + float64((high-low)/2))
	self := 0
	for i := range n.List {
		n.List[i].Rank = i + 1
		if n.List[i].Itself {
			self = i
		}
	}
	if n.Held <= most {
		return
	}
	third := most / 3
	var kept []Neighbour
	for i, x := range n.List {
		if i < third || i >= n.Held-third || i >= self-third/2 && i <= self+third/2 {
			x.Gap = len(kept) > 0 && kept[len(kept)-1].Rank != x.Rank-1
			kept = append(kept, x)
		}
	}
	n.List = kept
}
