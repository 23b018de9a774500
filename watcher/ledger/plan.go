package ledger

import (
	"bytes"
	"cmp"
	"fmt"
	"slices"

	"strayd/rules"
	"strayd/watcher"
)

// plan is a batch made ready: checked as far as it can be without the ledger, and in the order of its keys.
type plan struct {
	batch   *watcher.Batch
	columns [2][]*watcher.Column
	used    []*watcher.UsedColumn
	states  []*watcher.State
	scales  []keyed[*watcher.GroupScale]
	flags   []*watcher.FlagRow
	index   []flagAt // keys of the index of flags
	held    uint32   // names before the batch
}

// keyed is a value with its key ready made.
type keyed[T any] struct {
	key   []byte
	value T
}

// flagAt is a key of the index of flags, see flagAtKey.
type flagAt [17]byte

func newPlan(b *watcher.Batch) (*plan, error) {
	p := &plan{batch: b}
	for w, columns := range [][]*watcher.Column{b.Returns, b.Prices} {
		var err error
		if p.columns[w], err = planColumns(watcher.What(w), columns); err != nil {
			return nil, err
		}
	}
	if err := p.planUsed(); err != nil {
		return nil, err
	}
	if err := p.planStates(); err != nil {
		return nil, err
	}
	p.planScales()
	return p, p.planFlags()
}

func planColumns(w watcher.What, columns []*watcher.Column) ([]*watcher.Column, error) {
	order := func(a, b *watcher.Column) int {
		return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Block, b.Block))
	}
	for _, c := range columns {
		switch {
		case c.V32 != nil && c.V64 != nil, c.Len() == 0, c.Len() > watcher.BlockSize:
			return nil, fmt.Errorf("column of %s, block %d: %d and %d values, want 1 to %d of one width", c.Date, c.Block, len(c.V32), len(c.V64),
				watcher.BlockSize)
		case int(c.Decimals) > w.Places():
			return nil, fmt.Errorf("column of %s, block %d: %d decimals, want at most %d", c.Date, c.Block, c.Decimals, w.Places())
		}
	}
	if !slices.IsSortedFunc(columns, order) {
		columns = slices.SortedFunc(slices.Values(columns), order)
	}
	for i := range columns[:max(0, len(columns)-1)] {
		if order(columns[i], columns[i+1]) == 0 {
			return nil, fmt.Errorf("column of %s, block %d stands twice in the batch", columns[i].Date, columns[i].Block)
		}
	}
	return columns, nil
}

func (p *plan) planUsed() error {
	for i := range p.batch.Used {
		u := &p.batch.Used[i]
		if len(u.Offsets) == 0 || len(u.Offsets) != len(u.Values) || int(u.Offsets[len(u.Offsets)-1]) >= watcher.BlockSize ||
			!slices.IsSorted(u.Offsets) {
			return fmt.Errorf("used values of range %d on %s, block %d: offsets must be ascending, below %d, one a value", u.Range, u.Date,
				u.Block, watcher.BlockSize)
		}
		p.used = append(p.used, u)
	}
	order := func(a, b *watcher.UsedColumn) int {
		return cmp.Or(cmp.Compare(a.Range, b.Range), cmp.Compare(a.Date, b.Date), cmp.Compare(a.Block, b.Block))
	}
	slices.SortFunc(p.used, order)
	return twice(p.used, order, func(u *watcher.UsedColumn) string {
		return fmt.Sprintf("used values of range %d on %s, block %d", u.Range, u.Date, u.Block)
	})
}

func twice[T any](list []T, order func(a, b T) int, name func(T) string) error {
	for i := range list[:max(0, len(list)-1)] {
		if order(list[i], list[i+1]) == 0 {
			return fmt.Errorf("%s stands twice in the batch", name(list[i]))
		}
	}
	return nil
}

func (p *plan) planStates() error {
	for i := range p.batch.States {
		s := &p.batch.States[i]
		n := len(s.N)
		if n > watcher.BlockSize || len(s.Last) != n || len(s.Sum) != n || len(s.Sq) != n || s.Var != nil && len(s.Var) != n {
			return fmt.Errorf("state of range %d, block %d: its parts differ in length", s.Range, s.Block)
		}
		p.states = append(p.states, s)
	}
	order := func(a, b *watcher.State) int {
		return cmp.Or(cmp.Compare(a.Range, b.Range), cmp.Compare(a.Block, b.Block))
	}
	slices.SortFunc(p.states, order)
	return twice(p.states, order, func(s *watcher.State) string { return fmt.Sprintf("state of range %d, block %d", s.Range, s.Block) })
}

func (p *plan) planScales() {
	for i := range p.batch.Scales {
		s := &p.batch.Scales[i]
		p.scales = append(p.scales, keyed[*watcher.GroupScale]{scaleKey(s.Range, s.Group, s.Date, p.batch.Step), s})
	}
	slices.SortFunc(p.scales, func(a, b keyed[*watcher.GroupScale]) int { return bytes.Compare(a.key, b.key) })
}

func (p *plan) planFlags() error {
	p.flags, p.index = make([]*watcher.FlagRow, 0, len(p.batch.Flags)), make([]flagAt, 0, len(p.batch.Flags))
	for _, f := range p.batch.Flags {
		if !slices.Contains(rules.Kinds, f.Kind) || !slices.Contains(rules.Standings, f.Standing) {
			return fmt.Errorf("flag %d: kind %q or standing %q is not known", f.Ref, f.Kind, f.Standing)
		}
		p.flags = append(p.flags, f)
		if f.New && f.SeriesID != watcher.NoSeries {
			p.index = append(p.index, flagAt(flagAtKey(f.Date, f.SeriesID, byte(indexOf(rules.Kinds, f.Kind)), f.Ref)))
		}
	}
	order := func(a, b *watcher.FlagRow) int { return cmp.Compare(a.Ref, b.Ref) }
	slices.SortFunc(p.flags, order)
	slices.SortFunc(p.index, func(a, b flagAt) int { return bytes.Compare(a[:], b[:]) })
	return twice(p.flags, order, func(f *watcher.FlagRow) string { return fmt.Sprintf("flag %d", f.Ref) })
}

// end is the highest series that has a value in the batch, plus one.
func (p *plan) end() (end uint64) {
	until := func(block uint32, n int) { end = max(end, uint64(block)*watcher.BlockSize+uint64(n)) }
	for _, columns := range p.columns {
		for _, c := range columns {
			until(c.Block, c.Len())
		}
	}
	for _, u := range p.used {
		until(u.Block, int(u.Offsets[len(u.Offsets)-1])+1)
	}
	for _, s := range p.states {
		until(s.Block, len(s.N))
	}
	for _, f := range p.flags {
		if f.New && f.SeriesID != watcher.NoSeries {
			end = max(end, uint64(f.SeriesID)+1)
		}
	}
	return end
}

// staging lists the spans of keys that the batch writes before it is published.
func (p *plan) staging() staging {
	step := p.batch.Step
	s := staging{step: step}
	add := func(in bucket, n int, key func(i int) []byte) {
		if n > 0 {
			s.spans = append(s.spans, span{in, key(0), key(n - 1)})
		}
	}
	chunks := p.chunks()
	add(inNames, len(chunks), func(i int) []byte { return put32(put32(nil, chunks[i]), step) })
	for w, columns := range p.columns {
		add(bucketOf(watcher.What(w)), len(columns), func(i int) []byte { return columnKey(nil, columns[i].Date, columns[i].Block, step) })
	}
	add(inUsed, len(p.used), func(i int) []byte { return usedKey(p.used[i].Range, p.used[i].Date, p.used[i].Block, step) })
	add(inStates, len(p.states), func(i int) []byte { return stateKey(p.states[i].Range, p.states[i].Block, step) })
	add(inScales, len(p.scales), func(i int) []byte { return p.scales[i].key })
	add(inFlags, len(p.flags), func(i int) []byte { return flagKey(p.flags[i].Ref, step) })
	add(inFlagAt, len(p.index), func(i int) []byte { return p.index[i][:] })
	return s
}

// chunks lists the chunks of names that the batch's new names fall into.
func (p *plan) chunks() (list []uint32) {
	if len(p.batch.NewNames) == 0 {
		return nil
	}
	last := (p.held + uint32(len(p.batch.NewNames)) - 1) / watcher.BlockSize
	for c := p.held / watcher.BlockSize; c <= last; c++ {
		list = append(list, c)
	}
	return list
}
