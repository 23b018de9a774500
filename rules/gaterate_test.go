package rules

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// inventedFile is a stream of files of one feed: groups that move with a factor each, heavy tails, volatility that clusters
// (GARCH(1,1) with alpha 0.08 and beta 0.90, Bollerslev 1986), printed in per cent with so many decimals.
type inventedFile struct {
	r         *rand.Rand
	slopes    []float64
	variance  [4]float64
	decimals  float64
	past      [][]float64 // by series, the newest TypicalDates values
	deviation float64     // of the factors, a fraction
}

func newInventedFile(seed uint64, series int, decimals int, deviation float64) *inventedFile {
	f := &inventedFile{r: rand.New(rand.NewPCG(seed, 12)), decimals: math.Pow(10, float64(decimals)), past: make([][]float64, series), deviation: deviation}
	for range series {
		f.slopes = append(f.slopes, 0.6+0.7*f.r.Float64())
	}
	for g := range f.variance {
		f.variance[g] = 1
	}
	return f
}

func (f *inventedFile) heavy() float64 {
	chi := 0.0
	for range 5 {
		n := f.r.NormFloat64()
		chi += n * n
	}
	return f.r.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5)
}

// next is the values of the next date as printed, as fractions.
func (f *inventedFile) next() []float64 {
	var factors [4]float64
	for g := range factors {
		shock := math.Sqrt(f.variance[g]) * f.heavy()
		factors[g] = f.deviation * shock
		f.variance[g] = 0.02 + 0.08*shock*shock + 0.90*f.variance[g]
	}
	row := make([]float64, len(f.slopes))
	for i, slope := range f.slopes {
		row[i] = f.print(slope*factors[i%4] + 0.25*f.deviation*f.heavy())
	}
	return row
}

func (f *inventedFile) print(v float64) float64 {
	return math.Round(100*v*f.decimals) / f.decimals / 100
}

// day holds a row against the past.
func (f *inventedFile) day(row []float64, by float64) FileDay {
	d := FileDay{Past: func(i int) (out []Units) {
		for _, x := range f.past[i] {
			out = append(out, Units(math.Round(x*1e15)))
		}
		return out
	}}
	for i, v := range row {
		past := f.past[i]
		sizes := make([]float64, len(past))
		c := Compared{Return: Units(math.Round(f.print(by*v) * 1e15)), Before: Missing, Held: len(past), Tick: Units(1e13 / f.decimals)}
		for n, x := range past {
			sizes[n] = math.Abs(x)
			if n > 0 && x == past[n-1] && x != 0 {
				c.Repeats++
			}
			if x == 0 {
				c.Zeros++
			}
			c.Before = Units(math.Round(x * 1e15))
		}
		slices.Sort(sizes)
		if n := len(sizes); n > 0 {
			c.Typical = (sizes[(n-1)/2] + sizes[n/2]) / 2
		}
		d.Values = append(d.Values, c)
	}
	return d
}

func (f *inventedFile) take(row []float64) {
	for i, v := range row {
		if f.past[i] = append(f.past[i], v); len(f.past[i]) > TypicalDates {
			f.past[i] = f.past[i][1:]
		}
	}
}

// The gates by size and by repeats over invented books: fewer than one ordinary file in 5,000 is refused, and 99.5 % of those a hundred
// times too large or too small are, of which 99 % are named. The figures are printed by
//
//	go test ./rules -run RateOfRefusals -v
func TestRateOfRefusals(t *testing.T) {
	files, refused, wrong, caught, named := 0, 0, [2]int{}, [2]int{}, [2]int{}
	dates := 1000
	if testing.Short() {
		dates = 400
	}
	for seed := range 12 {
		// of series that move by 0.4 % a day, a hundredth in two decimals is a file of zeros, which cannot be told from stale ones
		f := newInventedFile(uint64(seed), []int{60, 20, 12, 60}[seed%4], 2+2*(seed%2), []float64{0.01, 0.01, 0.004, 0.01}[seed%4])
		for n := range dates {
			row := f.next()
			if n >= TypicalDates {
				files++
				if d := f.day(row, 1); RefuseScale(d) != nil || RefuseRepeat(d) != nil {
					refused++
				}
				for k, by := range []float64{100, 0.01} {
					if len(row) < 60 || n%5 > 0 { // the book has 60 series
						continue
					}
					wrong[k]++
					if r := RefuseScale(f.day(row, by)); r != nil {
						caught[k]++
						if r.LooksLike == []Cause{CauseX100, CauseDiv100}[k] {
							named[k]++
						}
					}
				}
			}
			f.take(row)
		}
	}
	t.Logf("%d ordinary files, %d refused", files, refused)
	t.Logf("x100: %d of %d refused, %d named; 1/100: %d of %d refused, %d named", caught[0], wrong[0], named[0], caught[1], wrong[1], named[1])
	if 5000*refused >= files && refused > 0 {
		t.Errorf("%d of %d ordinary files refused", refused, files)
	}
	for k := range wrong {
		if float64(caught[k]) < 0.995*float64(wrong[k]) || float64(named[k]) < 0.99*float64(caught[k]) {
			t.Errorf("fault %d: %d of %d refused, %d named", k, caught[k], wrong[k], named[k])
		}
	}
}
