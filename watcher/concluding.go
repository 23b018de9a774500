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

// conclude gathers how the pool takes the values of each date in the end: what it says of a date, then what the date after settles.
// Values that it takes as they are stand only where the ledger may say otherwise.
func (w *weighed) conclude(held []rules.Date) {
	w.uses = map[rules.Date]map[int]causes.Use{}
	set := func(date rules.Date, member int, u causes.Use) {
		if _, old := slices.BinarySearch(held, date); u == causes.AsIs && !old && w.uses[date][member] == u {
			return
		}
		if w.uses[date] == nil {
			w.uses[date] = map[int]causes.Use{}
		}
		w.uses[date][member] = u
	}
	dates := w.dates()
	for _, date := range dates {
		d := w.days[date]
		for m, fresh := range d.fresh {
			if fresh {
				set(date, m, use(d.view(int32(m))))
			}
		}
		for _, b := range d.Wrong {
			set(date, b.Member, causes.Out)
		}
	}
	for _, date := range dates {
		for n := range w.days[date].Earlier {
			e := &w.days[date].Earlier[n]
			set(e.Date, e.Member, use(e))
		}
	}
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

// conclusions lists the conclusions that are not those held, as used values of their own.
func (j *judging) conclusions(v View) (out []UsedColumn, err error) {
	dates := make([]rules.Date, 0, len(j.weighed.uses))
	for d := range j.weighed.uses {
		dates = append(dates, d)
	}
	slices.Sort(dates)
	for _, d := range dates {
		columns, err := j.changedUses(v, d)
		if err != nil {
			return nil, err
		}
		out = append(out, columns...)
	}
	return out, nil
}

// changedUses are the conclusions about a date that are not those held.
func (j *judging) changedUses(v View, date rules.Date) (out []UsedColumn, err error) {
	c, uses := j.weighed.crew, j.weighed.uses[date]
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

// replays has blocks gone through again from the first date of which a value that the file does not change is now taken otherwise, or is
// judged anew.
func (j *judging) replays(blocks []block, concluded []UsedColumn) []block {
	since := func(number uint32, date rules.Date) {
		n := slices.IndexFunc(blocks, func(b block) bool { return b.number == number })
		if n < 0 {
			n = len(blocks)
			blocks = append(blocks, block{number: number, series: min(BlockSize, j.names.Len()-int(number)*BlockSize), since: date})
		}
		if b := &blocks[n]; b.since == rules.NoDate || date < b.since {
			b.since = date
		}
	}
	for _, u := range concluded {
		if _, old := slices.BinarySearch(j.held, u.Date); old {
			since(u.Block, u.Date)
		}
	}
	for _, date := range j.weighed.dates() {
		d := j.weighed.days[date]
		for m, woken := range d.woken {
			if woken {
				since(j.weighed.crew.series[m]/BlockSize, date)
			}
		}
	}
	slices.SortFunc(blocks, func(x, y block) int { return int(x.number) - int(y.number) })
	return blocks
}
