package ledger

import (
	"math"

	"strayd/rules"
	"strayd/watcher"
)

// Dates lists the dates on which anything is held, ascending.
func (v *View) Dates(w watcher.What) (dates []rules.Date, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	in := bucketOf(w)
	c := v.cursors[in]
	for k, _ := c.First(); k != nil; {
		if len(k) != 12 {
			return nil, malformed(in, k, "its key has the wrong length")
		}
		if stepOf(k) > v.head.step {
			k, _ = c.Next()
			continue
		}
		date := get32(k)
		dates = append(dates, unordered(date))
		if date == math.MaxUint32 {
			break
		}
		k, _ = c.Seek(put32(nil, date+1))
	}
	return dates, nil
}

// Fill writes the newest values of one date; see watcher.View.
func (v *View) Fill(w watcher.What, date rules.Date, block uint32, from int, dst []int64) (held bool, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return false, err
	}
	in := bucketOf(w)
	var room [12]byte
	key := columnKey(room[:0], date, block, 0)
	c := v.cursors[in]
	for k, value := c.Seek(key); hasPrefix(k, key[:8]); k, value = c.Next() {
		if len(k) == 12 && stepOf(k) > v.head.step {
			break
		}
		l, err := v.layer(in, k, value)
		if err != nil {
			return held, err
		}
		mul := int64(rules.Pow10(w.Places() - l.decimals))
		if held {
			l.overlay(dst, from, mul)
		} else {
			l.write(dst, from, mul)
		}
		held = true
	}
	return held, nil
}

func (v *View) layer(in bucket, key, value []byte) (layer, error) {
	body, err := checked(in, key, value)
	if err != nil {
		return layer{}, err
	}
	l, why := parseLayer(body)
	if why == "" && l.decimals > places(in) {
		why = "it has more decimals than there can be"
	}
	if why != "" {
		return l, malformed(in, key, why)
	}
	return l, nil
}

func places(in bucket) int {
	if in == inPrices {
		return watcher.Prices.Places()
	}
	return watcher.Returns.Places()
}

// Patch overwrites cells with used values; see watcher.View.
func (v *View) Patch(rangeID uint16, date rules.Date, block uint32, from int, dst []int64) (err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return err
	}
	c := v.cursors[inUsed]
	key := usedKey(rangeID, date, block, 0)
	for k, value := c.Seek(key); hasPrefix(k, key[:10]); k, value = c.Next() {
		if len(k) == 14 && stepOf(k) > v.head.step {
			break
		}
		u, err := usedCells(k, value)
		if err != nil {
			return err
		}
		for i := range u.n {
			if at := u.offset(i) - from; at >= 0 && at < len(dst) {
				dst[at] = u.value(i)
			}
		}
	}
	return nil
}

func usedCells(key, value []byte) (cells, error) {
	body, err := checked(inUsed, key, value)
	if err != nil {
		return cells{}, err
	}
	u, ok := parseCells(body)
	if !ok {
		return u, malformed(inUsed, key, "it cannot be read")
	}
	return u, nil
}

// Marked lists the offsets of the cells of one date and block that bear a flag about a value out of line: breach, limit,
// doubtful, stale, repeat.
func (v *View) Marked(date rules.Date, block uint32) (offsets []int, err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return nil, err
	}
	first, last := block*watcher.BlockSize, (block+1)*watcher.BlockSize
	day := put32(nil, ordered(date))
	c := v.cursors[inFlagAt]
	for k, value := c.Seek(put32(day, first)); hasPrefix(k, day); k, value = c.Next() {
		if _, err := checked(inFlagAt, k, value); err != nil {
			return nil, err
		}
		series := get32(k[4:])
		if series >= last {
			break
		}
		if int(k[8]) >= len(rules.Kinds) {
			return nil, malformed(inFlagAt, k, "its kind is not known")
		}
		offset := int(series - first)
		again := len(offsets) > 0 && offsets[len(offsets)-1] == offset
		if marks(k[8]) && !again && published(inFlagAt, k, v.head) {
			offsets = append(offsets, offset)
		}
	}
	return offsets, nil
}

// Series gives every version of every date of one series, by date, then step.
func (v *View) Series(w watcher.What, id uint32) (list []watcher.Version, err error) {
	in := bucketOf(w)
	offset := int(id % watcher.BlockSize)
	err = v.walkBlock(in, 0, id/watcher.BlockSize, func(k, value []byte) error {
		l, err := v.layer(in, k, value)
		if err != nil {
			return err
		}
		if cell, rank, ok := l.find(offset); ok {
			list = append(list, watcher.Version{Date: unordered(get32(k)), Step: stepOf(k),
				Value: cell * int64(rules.Pow10(w.Places()-l.decimals)), Line: l.line(rank)})
		}
		return nil
	})
	return list, err
}

// Used gives every used value of one series that was stored for a range, by date, then step. One that equals the return of its
// step says that an earlier one is withdrawn.
func (v *View) Used(rangeID uint16, id uint32) (list []watcher.Version, err error) {
	offset := int(id % watcher.BlockSize)
	err = v.walkBlock(inUsed, rangeID, id/watcher.BlockSize, func(k, value []byte) error {
		u, err := usedCells(k, value)
		if err != nil {
			return err
		}
		for i := range u.n {
			if u.offset(i) == offset {
				list = append(list, watcher.Version{Date: unordered(get32(k[2:])), Step: stepOf(k), Value: u.value(i)})
			}
		}
		return nil
	})
	return list, err
}

// walkBlock calls do with every published layer of one block, date by date, seeking past the other blocks of a date. For used
// values the keys of one range are walked.
func (v *View) walkBlock(in bucket, rangeID uint16, block uint32, do func(k, value []byte) error) (err error) {
	defer v.leave(v.enter(&err), &err)
	if err != nil {
		return err
	}
	var prefix []byte
	if in == inUsed {
		prefix = put16(nil, rangeID)
	}
	at := len(prefix)
	c := v.cursors[in]
	for k, value := c.Seek(prefix); k != nil && hasPrefix(k, prefix); {
		if len(k) != at+12 {
			return malformed(in, k, "its key has the wrong length")
		}
		date, held := get32(k[at:]), get32(k[at+4:])
		switch {
		case held < block:
			k, value = c.Seek(put32(put32(prefix[:at:at], date), block))
			continue
		case held > block && date == math.MaxUint32:
			return nil
		case held > block:
			k, value = c.Seek(put32(put32(prefix[:at:at], date+1), block))
			continue
		}
		if stepOf(k) <= v.head.step {
			if err := do(k, value); err != nil {
				return err
			}
		}
		k, value = c.Next()
	}
	return nil
}
