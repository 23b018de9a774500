package watcher

import (
	"strayd/rules"
	"strayd/rules/causes"
)

// Conclusion is what was concluded of one value as it stands: by a flag that nobody has decided yet, or by a person.
type Conclusion struct {
	Series uint32
	Use    causes.Use
	Value  rules.Units // for Instead
}

// Conclusions lists what was concluded of the values of one date and block, by series. A value that is not in the list enters windows as
// it is. ranges are the numbers of the ranges whose used values tell a value that is clipped from one that is left out; see RangeNumbers.
func Conclusions(v View, ranges []uint16, date rules.Date, block uint32) ([]Conclusion, error) {
	marked, err := v.Marked(date, block)
	if err != nil || len(marked) == 0 {
		return nil, err
	}
	raw := make([]int64, BlockSize)
	if _, err := v.Fill(Returns, date, block, 0, raw); err != nil {
		return nil, err
	}
	steps, err := versionSteps(v, date, block, marked)
	if err != nil {
		return nil, err
	}
	taken, err := takenBy(v, ranges, date, block, raw)
	if err != nil {
		return nil, err
	}
	var out []Conclusion
	for n, at := range marked {
		series := block*BlockSize + uint32(at)
		about, err := aboutValue(v, series, date, steps[n])
		if err != nil {
			return nil, err
		}
		if c, ok := about.conclusion(rules.Units(raw[at]), taken[at]); ok {
			c.Series = series
			out = append(out, c)
		}
	}
	return out, nil
}

// conclusion is what the flags of a value say together; taken says that some window takes a part of it.
func (a *about) conclusion(x rules.Units, taken bool) (c Conclusion, ok bool) {
	switch {
	case a.decided == nil && !a.flagged:
		return c, false
	case a.decided == nil && taken:
		c.Use = causes.Clipped
	case a.decided == nil, a.decided.Uses(x) == rules.Missing:
		c.Use = causes.Out
	case a.decided.Conclusion == rules.Corrected:
		c.Use, c.Value = causes.Instead, a.decided.Value
	}
	return c, true
}

// takenBy says of each value of a date whether the window of one of the ranges takes something for it.
func takenBy(v View, ranges []uint16, date rules.Date, block uint32, raw []int64) ([]bool, error) {
	taken := make([]bool, len(raw))
	used := make([]int64, len(raw))
	for _, id := range ranges {
		copy(used, raw)
		if err := v.Patch(id, date, block, 0, used); err != nil {
			return nil, err
		}
		outsize(used)
		for i, x := range used {
			taken[i] = taken[i] || x != Missing64
		}
	}
	return taken, nil
}

// RangeNumbers are the numbers in the ledger of the ranges of some settings that keep windows of returns.
func RangeNumbers(v View, s *rules.Settings) ([]uint16, error) {
	known, err := rangeIDs(v)
	if err != nil {
		return nil, err
	}
	var out []uint16
	for n, r := range s.Ranges {
		if id := known[s.Identity(n)]; id != 0 && r.Limit == nil && r.Of == rules.Return {
			out = append(out, id)
		}
	}
	return out, nil
}

// Decided is what somebody decided of an observation as it stands, nil for nothing.
func (r *Reader) Decided(series string, date rules.Date) (*rules.Act, error) {
	id, ok := r.Names.Find([]byte(series))
	if !ok {
		return nil, &UnknownSeries{series}
	}
	steps, err := versionSteps(r.View, date, id/BlockSize, []int{int(id % BlockSize)})
	if err != nil {
		return nil, err
	}
	about, err := aboutValue(r.View, id, date, steps[0])
	return about.decided, err
}
