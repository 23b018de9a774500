package rules

import (
	"math"

	"strayd/stats"
)

// apartMost is how many series of a file are held against each other.
const apartMost = 128

// apart is the median, over some series of a file, of what a series leaves of its nearest companion, in its usual size: what is
//
//	|x - k y| / median of |x - k y| in the past
//
// where y is the series of the file that it moved with most, and k the slope on it through the origin. When a market stands still, or falls,
// this stays near 1; when a file has the wrong unit, it does not. n is how many series it is of: those that leave something.
func (d *FileDay) apart(of func(*Compared) bool) (ratio float64, n int) {
	f := d.companions(of)
	var ratios []float64
	for i := range f {
		if r, ok := f.left(i); ok {
			ratios = append(ratios, r)
		}
	}
	ratio, _ = stats.Median(ratios)
	return ratio, len(ratios)
}

// companion is a series of a file with its past, in typical sizes.
type companion struct {
	value Units
	now   float64
	past  []float64 // NaN where there is none
	half  float64   // of the last digit
}

type companions []companion

func anyValue(*Compared) bool { return true }

// companions gathers series of a file, at most apartMost.
func (d *FileDay) companions(of func(*Compared) bool) (f companions) {
	if d.Past == nil {
		return nil
	}
	var chosen []int
	for n := range d.Values {
		if c := &d.Values[n]; c.sized() && of(c) {
			chosen = append(chosen, n)
		}
	}
	step := max(1, (len(chosen)+apartMost-1)/apartMost)
	for k := 0; k < len(chosen); k += step {
		n := chosen[k]
		c := &d.Values[n]
		one := companion{value: c.Return, now: c.Return.Float() / c.Typical, half: c.Tick.Float() / 2 / c.Typical}
		for _, u := range d.Past(n) {
			x := math.NaN()
			if u != Missing {
				x = u.Float() / c.Typical
			}
			one.past = append(one.past, x)
		}
		f = append(f, one)
	}
	return f
}

// left is what the i-th leaves of its nearest companion, in its usual size. ok is false where it usually leaves no more than rounding does.
func (f companions) left(i int) (ratio float64, ok bool) {
	nearest, slope, best := -1, 0.0, 0.0
	for j := range f {
		if k, r2 := together(f[i].past, f[j].past); j != i && r2 > best {
			nearest, slope, best = j, k, r2
		}
	}
	if nearest < 0 {
		return 0, false
	}
	var sizes []float64
	for t, x := range f[i].past {
		if e := math.Abs(x - float64(slope*f[nearest].past[t])); e == e {
			sizes = append(sizes, e)
		}
	}
	usual, _ := stats.Median(sizes)
	rounding := f[i].half + float64(math.Abs(slope)*f[nearest].half)
	if len(sizes) < gateDates || usual <= 2*rounding {
		return 0, false
	}
	return max(math.Abs(f[i].now-float64(slope*f[nearest].now)), rounding/2) / usual, true
}

// together is the slope of x on y through the origin, and the share of x that it explains. Far values count for three typical sizes.
func together(x, y []float64) (slope, explains float64) {
	var xx, yy, xy float64
	for t := range x {
		a, b := min(max(x[t], -3), 3), min(max(y[t], -3), 3)
		if a == a && b == b {
			xx, yy, xy = xx+float64(a*a), yy+float64(b*b), xy+float64(a*b)
		}
	}
	if xx == 0 || yy == 0 {
		return 0, 0
	}
	return xy / yy, xy * xy / (xx * yy)
}
