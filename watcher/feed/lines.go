package feed

import "strayd/watcher"

// noteRun notes the lines of values at consecutive offsets after all that were held; they are stored already.
func (o *open) noteRun(off, n int, line, stride uint32) {
	for i := range n {
		if i >= 2 && o.Lines.At == nil && o.Lines.Stride == stride {
			rest := uint32(n - i)
			o.count += rest
			o.last += rest * stride
			return
		}
		o.note(off+i, line, true)
		line += stride
	}
}

// note notes the line of a new value. ascending says that all values noted before stand at lower offsets; else the value is not
// stored yet. While lines are evenly spaced, first and stride say it all.
func (o *open) note(off int, line uint32, ascending bool) {
	l := &o.Lines
	switch {
	case l.At != nil:
		l.At[off] = line
	case o.count == 0:
		l.First = line
	case ascending && o.count == 1:
		l.Stride = line - l.First
	case !ascending || line-o.last != l.Stride:
		o.spell()
		o.Lines.At[off] = line
	}
	o.last = line
	o.count++
}

// spell turns first and stride into a line for each offset.
func (o *open) spell() {
	at := make([]uint32, o.Len(), max(cap(o.V32), cap(o.V64)))
	line := o.Lines.First
	for i := range at {
		if o.has(i) {
			at[i] = line
			line += o.Lines.Stride
		}
	}
	o.Lines.First, o.Lines.Stride, o.Lines.At = 0, 0, at
}

func (o *open) has(off int) bool {
	if o.wide {
		return o.V64[off] != watcher.Missing64
	}
	return o.V32[off] != watcher.Missing32
}
