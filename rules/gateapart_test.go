package rules

import (
	"math"
	"math/rand/v2"
	"testing"
)

// oneMarket are files of series that all follow one market, as share classes and trackers do.
type oneMarket struct {
	r      *rand.Rand
	rest   float64 // deviation of what each leaves of the market's 1 %
	tick   float64 // of a per cent
	slopes []float64
	past   [][]float64
}

func (m *oneMarket) next(market float64) []float64 {
	row := make([]float64, len(m.slopes))
	for i, s := range m.slopes {
		row[i] = math.Round((s*market+100*m.rest*m.r.NormFloat64())/m.tick) * m.tick
	}
	return row
}

func (m *oneMarket) day(row []float64, by float64) FileDay {
	f := inventedFile{decimals: math.Round(1 / m.tick), past: make([][]float64, len(row))}
	scaled := make([]float64, len(row))
	for i := range row {
		scaled[i] = row[i] / 100
		for _, p := range m.past[max(0, len(m.past)-TypicalDates):] {
			f.past[i] = append(f.past[i], p[i]/100)
		}
	}
	d := f.day(scaled, by)
	for range lowDays {
		d.Prior = append(d.Prior, 1)
	}
	return d
}

// Files of series that follow one market are small when it stands still, which they do one day in forty, and large when it falls. Neither makes a
// wrong unit; a wrong unit is found all the same where the series leave something of each other.
func TestSeriesOfOneMarket(t *testing.T) {
	const days = 1500
	for _, c := range []struct {
		name       string
		rest, tick float64
		found      float64 // least share of wrong units that is found
	}{
		{"trackers, four decimals", 0.0003, 0.0001, 0.99},
		{"funds, two decimals", 0.002, 0.01, 0.99},
		{"share classes, two decimals", 0, 0.01, 0.4},
	} {
		const seed = 3
		m := &oneMarket{r: rand.New(rand.NewPCG(seed, 9)), rest: c.rest, tick: c.tick}
		for range 20 {
			m.slopes = append(m.slopes, 0.8+0.4*m.r.Float64())
		}
		tried, refused, found := 0, 0, [2]int{}
		for n := range days {
			row := m.next(m.r.NormFloat64())
			if n >= TypicalDates {
				tried++
				if d := m.day(row, 1); RefuseScale(d) != nil || RefuseRepeat(d) != nil {
					refused++
				}
				for k, by := range []float64{100, 0.01} {
					if RefuseScale(m.day(row, by)) != nil {
						found[k]++
					}
				}
			}
			m.past = append(m.past, row)
		}
		t.Logf("seed %d, %s: %d of %d ordinary files refused, x100 %d, 1/100 %d", seed, c.name, refused, tried, found[0], found[1])
		if refused > 0 {
			t.Errorf("%s: %d of %d ordinary files refused", c.name, refused, tried)
		}
		if c.rest > 0 && float64(min(found[0], found[1])) < c.found*float64(tried) {
			t.Errorf("%s: x100 found %d times, 1/100 %d times, of %d", c.name, found[0], found[1], tried)
		}
		if float64(found[0]) < c.found*float64(tried) {
			t.Errorf("%s: x100 found %d times of %d", c.name, found[0], tried)
		}
		for _, fall := range []float64{-8, -14, -25, 20} {
			if r := RefuseScale(m.day(m.next(fall), 1)); r != nil {
				t.Errorf("%s: a move of %g deviations is refused: %s", c.name, fall, r.Why)
			}
		}
	}
}

// Few series with many zeros of their own may all be at zero, for days: their files stand.
func TestZerosOfTheirOwn(t *testing.T) {
	const seed = 5
	r := rand.New(rand.NewPCG(seed, 10))
	for _, series := range []int{1, 3, 6, 15} {
		m := &oneMarket{r: r, rest: 0.01, tick: 0.01, slopes: make([]float64, series)}
		for n := range 800 {
			row := m.next(0)
			for i := range row {
				if r.Float64() < 0.4 {
					row[i] = 0
				}
			}
			if n >= TypicalDates {
				d := m.day(row, 1)
				for k := range d.Prior {
					d.Prior[k], _ = SizeRatio(m.dayBefore(k).Values)
				}
				if got := RefuseScale(d); got != nil {
					t.Fatalf("seed %d, %d series, day %d: %s", seed, series, n, got.Why)
				}
			}
			m.past = append(m.past, row)
		}
	}
}

// dayBefore is the k-th day before the newest, held against the same past.
func (m *oneMarket) dayBefore(k int) FileDay { return m.day(m.past[len(m.past)-1-k], 1) }

// Series that move little repeat together; what they repeat are few values.
func TestFewValuesRepeat(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 11))
	d := FileDay{Past: func(int) (out []Units) {
		for range TypicalDates {
			out = append(out, Units(r.IntN(99)-49)*1e11)
		}
		return out
	}}
	for i := range 40 {
		v := Units(i%5+1) * 1e11
		d.Values = append(d.Values, Compared{Return: v, Before: v, Typical: 0.0025, Held: 60, Repeats: 4, Tick: 1e11})
	}
	if r := RefuseRepeat(d); r != nil {
		t.Errorf("five values, 40 times: %s", r.Why)
	}
	for i := range d.Values {
		v := Units(i+1) * 1e11
		d.Values[i].Return, d.Values[i].Before = v, v
	}
	if RefuseRepeat(d) == nil {
		t.Error("40 different values that are those of the day before pass")
	}
}
