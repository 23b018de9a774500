package watcher

import (
	"slices"

	"strayd/rules"
	"strayd/rules/causes"
)

// use is how the pool takes a value that it has this view of, nil for none.
func use(v *causes.View) causes.Use {
	switch {
	case v == nil:
		return causes.AsIs
	case v.Out:
		return causes.Out
	}
	return v.Use
}

// conclusions lists, as used values of their own, what the pool concluded of the values that a file changes, and what it concludes
// now of a value of the date before.
func (j *judging) conclusions(v View) ([]UsedColumn, error) {
	if j.weighed == nil {
		return nil, nil
	}
	c := j.weighed.crew
	now := map[rules.Date]map[int]causes.Use{}
	set := func(date rules.Date, member int, u causes.Use) {
		if now[date] == nil {
			now[date] = map[int]causes.Use{}
		}
		now[date][member] = u
	}
	dates := j.weighed.dates()
	for _, date := range dates {
		d := j.weighed.days[date]
		for m, fresh := range d.fresh {
			if fresh {
				set(date, m, use(d.view(int32(m))))
			}
		}
		for _, w := range d.Wrong {
			set(date, w.Member, causes.Out)
		}
	}
	for _, date := range dates {
		for n := range j.weighed.days[date].Earlier {
			e := &j.weighed.days[date].Earlier[n]
			set(e.Date, e.Member, use(e))
		}
	}
	var out []UsedColumn
	for date, uses := range now { // put in order with all other used values
		columns, err := j.changedUses(v, c, date, uses)
		if err != nil {
			return nil, err
		}
		out = append(out, columns...)
	}
	return out, nil
}

// changedUses are the uses of a date that are not those held.
func (j *judging) changedUses(v View, c *crew, date rules.Date, uses map[int]causes.Use) (out []UsedColumn, err error) {
	members := make([]int, 0, len(uses))
	for m := range uses {
		members = append(members, m)
	}
	slices.Sort(members)
	_, old := slices.BinarySearch(j.held, date)
	held := make([]int64, BlockSize)
	for _, m := range members {
		block, at := c.series[m]/BlockSize, uint16(c.series[m]%BlockSize)
		if n := len(out); n == 0 || out[n-1].Block != block {
			out = append(out, UsedColumn{Range: j.concluded, Date: date, Block: block})
			clear(held)
			if old && int(block)*BlockSize < j.heldNames {
				if err := v.Patch(j.concluded, date, block, 0, held); err != nil {
					return nil, err
				}
			}
		}
		if u := int64(uses[m]); u != held[at] {
			last := &out[len(out)-1]
			last.Offsets, last.Values = append(last.Offsets, at), append(last.Values, u)
		}
	}
	return slices.DeleteFunc(out, func(u UsedColumn) bool { return len(u.Offsets) == 0 }), nil
}

// dates lists the dates that were weighed, ascending.
func (w *weighed) dates() []rules.Date {
	out := make([]rules.Date, 0, len(w.days))
	for d := range w.days {
		out = append(out, d)
	}
	slices.Sort(out)
	return out
}
