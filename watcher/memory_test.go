package watcher_test

import (
	"cmp"
	"slices"

	"strayd/rules"
	"strayd/watcher"
)

// memory is a store that keeps every batch as it came and answers each question by looking through all of them.
type memory struct {
	batches []*watcher.Batch
	passes  []watcher.PassRow
}

func (m *memory) View() (watcher.View, error) {
	return &memoryView{batches: slices.Clone(m.batches), passes: slices.Clone(m.passes)}, nil
}

func (m *memory) Publish(b *watcher.Batch) error {
	kept := *b
	kept.Flags = nil
	for _, f := range b.Flags { // the pass may change a flag of its own later
		copied := *f
		kept.Flags = append(kept.Flags, &copied)
	}
	m.batches = append(m.batches, &kept)
	return nil
}

func (m *memory) EndPass(r watcher.PassRow) error {
	m.passes = append(m.passes, r)
	return nil
}

// memoryView is the store as of a step. The methods that no test here needs are those of the nil View, which panic.
type memoryView struct {
	watcher.View
	batches []*watcher.Batch
	passes  []watcher.PassRow
	columns map[cellDate][]*watcher.Column // returns by date and block, oldest first; filled when first asked for
}

type cellDate struct {
	date  rules.Date
	block uint32
}

func (v *memoryView) Close() error { return nil }
func (v *memoryView) Step() uint32 { return uint32(len(v.batches)) }
func (v *memoryView) AsOf(step uint32) watcher.View {
	return &memoryView{batches: v.batches[:step]}
}
func (v *memoryView) Head() (string, error) { return "", nil }

func (v *memoryView) NextRef() uint64 {
	next := uint64(1)
	for _, b := range v.batches {
		for _, f := range b.Flags {
			next = max(next, f.Ref+1)
		}
	}
	return next
}

func (v *memoryView) Names() (*watcher.Names, error) {
	var text []byte
	var ends []uint32
	for _, b := range v.batches {
		for _, name := range b.NewNames {
			text = append(text, name...)
			ends = append(ends, uint32(len(text)))
		}
	}
	return watcher.NewNames(text, ends), nil
}

func columnsOf(b *watcher.Batch, w watcher.What) []*watcher.Column {
	if w == watcher.Prices {
		return b.Prices
	}
	return b.Returns
}

func (v *memoryView) Dates(w watcher.What) (out []rules.Date, _ error) {
	for _, b := range v.batches {
		for _, c := range columnsOf(b, w) {
			out = append(out, c.Date)
		}
	}
	slices.Sort(out)
	return slices.Compact(out), nil
}

// held is the columns of returns of one date and block, oldest first.
func (v *memoryView) held(date rules.Date, block uint32) []*watcher.Column {
	if v.columns == nil {
		v.columns = map[cellDate][]*watcher.Column{}
		for _, b := range v.batches {
			for _, c := range b.Returns {
				at := cellDate{c.Date, c.Block}
				v.columns[at] = append(v.columns[at], c)
			}
		}
	}
	return v.columns[cellDate{date, block}]
}

func (v *memoryView) Fill(w watcher.What, date rules.Date, block uint32, from int, dst []int64) (bool, error) {
	if w != watcher.Returns {
		panic("these tests hold no prices")
	}
	columns := v.held(date, block)
	if len(columns) == 0 {
		return false, nil
	}
	for i := range dst {
		dst[i] = watcher.Missing64
	}
	layer := make([]int64, len(dst))
	for _, c := range columns {
		c.Fill(layer, from, rules.Places)
		for i, x := range layer {
			if x != watcher.Missing64 {
				dst[i] = x
			}
		}
	}
	return true, nil
}

func (v *memoryView) Patch(rangeID uint16, date rules.Date, block uint32, from int, dst []int64) error {
	for _, b := range v.batches {
		for _, u := range b.Used {
			if u.Range != rangeID || u.Date != date || u.Block != block {
				continue
			}
			for n, off := range u.Offsets {
				if i := int(off) - from; i >= 0 && i < len(dst) {
					dst[i] = u.Values[n]
				}
			}
		}
	}
	return nil
}

// newest is every flag as it stands, by ref.
func (v *memoryView) newest() map[uint64]*watcher.FlagRow {
	out := map[uint64]*watcher.FlagRow{}
	for _, b := range v.batches {
		for _, f := range b.Flags {
			out[f.Ref] = f
		}
	}
	return out
}

func (v *memoryView) Marked(date rules.Date, block uint32) (out []int, _ error) {
	for _, f := range v.newest() {
		if f.Date == date && f.SeriesID/watcher.BlockSize == block && slices.Contains(rules.Concluded, f.Kind) {
			out = append(out, int(f.SeriesID%watcher.BlockSize))
		}
	}
	slices.Sort(out)
	return slices.Compact(out), nil
}

func (v *memoryView) Layers(w watcher.What, date rules.Date, block uint32, each func(step uint32, vals []int64) error) error {
	for n, b := range v.batches {
		for _, c := range columnsOf(b, w) {
			if c.Date != date || c.Block != block {
				continue
			}
			vals := make([]int64, watcher.BlockSize)
			c.Fill(vals, 0, w.Places())
			if err := each(uint32(n+1), vals); err != nil {
				return err
			}
		}
	}
	return nil
}

func byDateThenStep(a, b watcher.Version) int {
	return cmp.Or(cmp.Compare(a.Date, b.Date), cmp.Compare(a.Step, b.Step))
}

func (v *memoryView) Series(w watcher.What, id uint32) (out []watcher.Version, _ error) {
	for n, b := range v.batches {
		for _, c := range columnsOf(b, w) {
			at := int(id % watcher.BlockSize)
			if c.Block != id/watcher.BlockSize || at >= c.Len() {
				continue
			}
			cell := make([]int64, 1)
			if c.Fill(cell, at, w.Places()); cell[0] != watcher.Missing64 {
				out = append(out, watcher.Version{Date: c.Date, Step: uint32(n + 1), Value: cell[0], Line: c.Line(at)})
			}
		}
	}
	slices.SortFunc(out, byDateThenStep)
	return out, nil
}

func (v *memoryView) Used(rangeID uint16, id uint32) (out []watcher.Version, _ error) {
	for n, b := range v.batches {
		for _, u := range b.Used {
			if at := slices.Index(u.Offsets, uint16(id%watcher.BlockSize)); u.Range == rangeID && u.Block == id/watcher.BlockSize && at >= 0 {
				out = append(out, watcher.Version{Date: u.Date, Step: uint32(n + 1), Value: u.Values[at]})
			}
		}
	}
	slices.SortFunc(out, byDateThenStep)
	return out, nil
}

func (v *memoryView) State(rangeID uint16, block uint32) (*watcher.State, error) {
	for _, b := range slices.Backward(v.batches) {
		for n := range b.States {
			if b.States[n].Range == rangeID && b.States[n].Block == block {
				return &b.States[n], nil
			}
		}
	}
	return nil, nil
}

func (v *memoryView) FileSeen(feed string, sha [32]byte, key string) (watcher.FileRow, bool, error) {
	for _, b := range v.batches {
		if b.File.File.Feed == feed && b.File.File.SHA256 == sha && b.File.FeedKey == key && b.File.Outcome != watcher.Changed {
			return b.File, true, nil
		}
	}
	return watcher.FileRow{}, false, nil
}

func (v *memoryView) File(step uint32) (watcher.FileRow, error) { return v.batches[step-1].File, nil }

func (v *memoryView) Files(each func(watcher.FileRow) bool) error {
	for _, b := range v.batches {
		if !each(b.File) {
			break
		}
	}
	return nil
}

func (v *memoryView) Ranges() (out []watcher.RangeKey, _ error) {
	for _, b := range v.batches {
		out = append(out, b.NewRanges...)
	}
	return out, nil
}

func (v *memoryView) GroupScales(rangeID uint16, group string) (out []watcher.GroupScale, _ error) {
	for _, b := range v.batches {
		for _, s := range b.Scales {
			if s.Range == rangeID && s.Group == group {
				out = append(out, s)
			}
		}
	}
	slices.SortStableFunc(out, func(a, b watcher.GroupScale) int { return cmp.Compare(a.Date, b.Date) })
	return out, nil
}

// texts is every settings text in order.
func (v *memoryView) texts() (out [][]byte) {
	for _, b := range v.batches {
		if b.Settings != nil {
			out = append(out, b.Settings)
		}
	}
	return out
}

func (v *memoryView) Settings(id uint32) ([]byte, error) { return v.texts()[id-1], nil }
func (v *memoryView) LastSettings() (uint32, error)      { return uint32(len(v.texts())), nil }

func (v *memoryView) FlagAt(series uint32, date rules.Date, kind rules.Kind) (out rules.Flag, ok bool, _ error) {
	for _, f := range v.newest() {
		if f.SeriesID == series && f.Date == date && f.Kind == kind && (!ok || f.Ref > out.Ref) {
			out, ok = f.Flag, true
		}
	}
	return out, ok, nil
}

func (v *memoryView) Flags(all bool, each func(rules.Flag) bool) error {
	return v.FlagsOf(all, func(watcher.FlagHead) bool { return true }, each)
}

func (v *memoryView) FlagsOf(_ bool, takes func(watcher.FlagHead) bool, each func(rules.Flag) bool) error {
	newest := v.newest()
	for ref := uint64(1); ref < v.NextRef(); ref++ {
		f := newest[ref]
		if f == nil || !takes(watcher.FlagHead{Kind: f.Kind, Standing: f.Standing, Step: f.Step, Date: f.Date, SeriesID: f.SeriesID}) {
			continue
		}
		if !each(f.Flag) {
			break
		}
	}
	return nil
}
