package feed

import (
	"math"

	"strayd/watcher"
)

// columns gives the finished columns by date, then block, each in its one canonical form: with the fewest decimals that hold
// all its values exactly, in 32 bits if they then fit.
func (b *builder) columns() []*watcher.Column {
	var all []*watcher.Column
	for _, dates := range b.spans {
		if dates == nil {
			continue
		}
		for _, day := range dates {
			for _, o := range day {
				if o != nil {
					o.settle()
					all = append(all, &o.Column)
				}
			}
		}
	}
	return all
}

func (o *open) settle() {
	if !o.wide {
		for o.Decimals > 0 && divide(o.V32, watcher.Missing32) {
			o.Decimals--
		}
		return
	}
	for o.Decimals > 0 && divide(o.V64, watcher.Missing64) {
		o.Decimals--
	}
	if small := shrink(o.V64); small != nil {
		o.V32, o.V64, o.wide = small, nil, false
	}
}

// divide takes one zero off the end of every value, if all have one.
func divide[T int32 | int64](vals []T, missing T) bool {
	for _, v := range vals {
		if v != missing && v%10 != 0 {
			return false
		}
	}
	for i, v := range vals {
		if v != missing {
			vals[i] = v / 10
		}
	}
	return true
}

// shrink gives the values in 32 bits, nil when one does not fit.
func shrink(vals []int64) []int32 {
	for _, v := range vals {
		if v != watcher.Missing64 && (v > math.MaxInt32 || v < -math.MaxInt32) {
			return nil
		}
	}
	small := make([]int32, len(vals))
	for i, v := range vals {
		small[i] = int32(v)
		if v == watcher.Missing64 {
			small[i] = watcher.Missing32
		}
	}
	return small
}
