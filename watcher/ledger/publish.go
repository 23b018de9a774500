package ledger

import (
	"fmt"
	"math"

	"strayd/watcher"
)

// Publish writes a batch as one visible step. A batch without an outcome in its file row leaves no file row. New flags carry
// the refs from View.NextRef on; a replaced one keeps its series. A cell of Used must be written again whenever its return
// changes after a used value was stored for it: the newest layer counts.
func (l *Ledger) Publish(b *watcher.Batch) error {
	p, err := newPlan(b)
	if err != nil {
		return fmt.Errorf("step %d: %w", b.Step, err)
	}
	return l.write(p, func(w *writer) error {
		if err := w.accepts(p); err != nil {
			return fmt.Errorf("step %d: %w", b.Step, err)
		}
		w.limit = l.commitSize
		if err := w.layers(p); err != nil {
			return err
		}
		w.limit = 0
		return w.rows(p)
	})
}

// accepts checks the batch against what is published.
func (w *writer) accepts(p *plan) error {
	b := p.batch
	if b.Step != w.head.step+1 {
		return fmt.Errorf("the ledger is at step %d", w.head.step)
	}
	if uint64(w.head.names)+uint64(len(b.NewNames)) >= math.MaxUint32-1 {
		return fmt.Errorf("%d names are held and %d more do not fit", w.head.names, len(b.NewNames))
	}
	for _, n := range b.NewNames {
		if len(n) == 0 || len(n) > longestName {
			return fmt.Errorf("a name has %d bytes, want 1 to %d", len(n), longestName)
		}
	}
	p.held = w.head.names
	if end, held := p.end(), uint64(w.head.names)+uint64(len(b.NewNames)); end > held {
		return fmt.Errorf("it has values up to series %d, and %d have a name", end-1, held)
	}
	ref := w.head.nextRef
	for _, f := range p.flags {
		switch {
		case !f.New && f.Ref >= w.head.nextRef:
			return fmt.Errorf("flag %d is to be replaced and is not held", f.Ref)
		case f.New && f.Ref != ref:
			return fmt.Errorf("new flag %d, want %d", f.Ref, ref)
		case f.New:
			ref++
		}
	}
	w.head.step, w.head.nextRef = b.Step, ref
	w.head.names += uint32(len(b.NewNames))
	w.grow(p.size())
	return nil
}

// layers puts all that is tagged with the step, in the order of buckets and keys.
func (w *writer) layers(p *plan) error {
	if err := w.names(p); err != nil {
		return err
	}
	for what, columns := range p.columns {
		key := make([]byte, 0, 12)
		for _, c := range columns {
			key = columnKey(key[:0], c.Date, c.Block, p.batch.Step)
			if err := w.put(bucketOf(watcher.What(what)), key, func(dst []byte) []byte { return appendColumn(dst, c) }); err != nil {
				return err
			}
			if p.batch.Spend {
				c.V32, c.V64, c.Lines.At = nil, nil, nil
			}
		}
	}
	for _, u := range p.used {
		key := usedKey(u.Range, u.Date, u.Block, p.batch.Step)
		if err := w.put(inUsed, key, func(dst []byte) []byte { return packCells(dst, u) }); err != nil {
			return err
		}
	}
	if err := w.states(p); err != nil {
		return err
	}
	for _, s := range p.scales {
		if err := w.put(inScales, s.key, func(dst []byte) []byte { return packScale(dst, s.value) }); err != nil {
			return err
		}
	}
	return w.flags(p)
}

// names puts the new names; the last chunk, when it has room, is written anew under this step.
func (w *writer) names(p *plan) error {
	names := p.batch.NewNames
	for _, c := range p.chunks() {
		var list [][]byte
		if first := c * watcher.BlockSize; first < p.held {
			old, key, err := w.lastChunk(c, p.held-first)
			if err != nil {
				return err
			}
			list = old
			w.dropped = append(w.dropped, drop{inNames, key})
		}
		n := min(watcher.BlockSize-len(list), len(names))
		list, names = append(list, names[:n]...), names[n:]
		if err := w.put(inNames, put32(put32(nil, c), p.batch.Step), func(dst []byte) []byte { return packNames(dst, list) }); err != nil {
			return err
		}
	}
	return nil
}

func (w *writer) lastChunk(c, want uint32) (names [][]byte, key []byte, err error) {
	key, value := newest(w.buckets[inNames].Cursor(), put32(nil, c), w.head.step-1)
	if key == nil {
		return nil, nil, malformed(inNames, put32(put32(nil, c), 0), "it is not there")
	}
	body, err := opened(inNames, key, value)
	if err != nil {
		return nil, nil, err
	}
	list, ok := parseChunk(body)
	if !ok || list.n != int(want) {
		return nil, nil, malformed(inNames, key, "it does not hold as many names as it should")
	}
	return list.names(), key, nil
}

// states puts new states and notes the ones that they replace.
func (w *writer) states(p *plan) error {
	for _, s := range p.states {
		key := stateKey(s.Range, s.Block, p.batch.Step)
		if old, _ := newest(w.buckets[inStates].Cursor(), key[:6], w.head.step-1); old != nil {
			w.dropped = append(w.dropped, drop{inStates, old})
		}
		if err := w.put(inStates, key, func(dst []byte) []byte { return packState(dst, s) }); err != nil {
			return err
		}
	}
	return nil
}

// flags puts flags, then the index of the new ones.
func (w *writer) flags(p *plan) error {
	for _, f := range p.flags {
		series := f.SeriesID
		if !f.New {
			held, err := w.heldFlag(f.Ref)
			if err != nil {
				return err
			}
			series = held.series
		}
		row := rowOf(&f.Flag, series, p.batch.Step, &p.batch.File)
		if err := w.put(inFlags, flagKey(f.Ref, p.batch.Step), func(dst []byte) []byte { return packFlag(dst, &row) }); err != nil {
			return err
		}
	}
	for i := range p.index {
		if err := w.put(inFlagAt, p.index[i][:], func(dst []byte) []byte { return dst }); err != nil {
			return err
		}
	}
	return nil
}

func (w *writer) heldFlag(ref uint64) (flagRow, error) {
	key, value := newest(w.buckets[inFlags].Cursor(), put64(nil, ref), w.head.step-1)
	if key == nil {
		return flagRow{}, fmt.Errorf("flag %d %w", ref, ErrNone)
	}
	body, err := opened(inFlags, key, value)
	if err != nil {
		return flagRow{}, err
	}
	row, ok := unpackFlag(ref, body)
	if !ok {
		return row, malformed(inFlags, key, "it cannot be read")
	}
	return row, nil
}
