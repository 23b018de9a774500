package main

import (
	"fmt"
	"math/big"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

// priceCell is one price at 1e-10 a unit.
type priceCell struct {
	date   rules.Date
	series string
	price  int64
}

// roundHalfEven rounds a rational to a whole number.
func roundHalfEven(r *big.Rat) *big.Int {
	twice := new(big.Int).Mul(r.Num(), big.NewInt(2))
	floor := new(big.Int).Div(r.Num(), r.Denom()) // Euclidean: rounds down for a positive denominator
	rest := new(big.Int).Sub(twice, new(big.Int).Mul(floor, new(big.Int).Mul(r.Denom(), big.NewInt(2))))
	c := rest.Cmp(r.Denom())
	if c > 0 || c == 0 && floor.Bit(0) == 1 {
		floor.Add(floor, big.NewInt(1))
	}
	return floor
}

// A price feed keeps prices; the return is their exact ratio less one, rounded once to a unit, and a late or changed price changes
// both returns that it enters.
func TestPricesAreExactRatios(t *testing.T) {
	for seed := range seeds() {
		t.Run(fmt.Sprintf("seed %d", seed), func(t *testing.T) {
			random := rand.New(rand.NewPCG(seed, 2))
			f := newFolder(t, "ranges:\n  - {name: hard, limit: [-50%, 50%]}\n")
			f.configure("feeds:\n  - {name: book, files: inbox/*.csv, value: price, columns: {value: price}}\nranges:\n  - {name: hard, limit: [-50%, 50%]}\n")
			held := map[string]map[rules.Date]int64{}
			restated := map[string]bool{} // series and date whose return was changed by a file
			for n, file := range priceFiles(random) {
				var text strings.Builder
				text.WriteString("date,series,price\n")
				for _, c := range file {
					fmt.Fprintf(&text, "%s,%s,%s\n", c.date, c.series, new(big.Rat).SetFrac64(c.price, 1e10).FloatString(10))
				}
				before := returnsOfPrices(held)
				for _, c := range file {
					if held[c.series] == nil {
						held[c.series] = map[rules.Date]int64{}
					}
					held[c.series][c.date] = c.price
				}
				for key, r := range returnsOfPrices(held) {
					if old, ok := before[key]; ok && old != r {
						restated[key] = true
					}
				}
				f.arrive(fmt.Sprintf("p%03d.csv", n), text.String())
			}
			comparePrices(t, f, held, restated)
		})
	}
}

// priceFiles is a book of prices as it arrives: a file a date, some prices late, some corrected later.
func priceFiles(random *rand.Rand) [][]priceCell {
	first, _ := rules.DateOf(2024, 1, 1)
	files := make([][]priceCell, 25)
	for s := range 6 {
		name := fmt.Sprintf("share-%d", s)
		price := float64(1+random.IntN(5000)) * 1e8 // 0.01 to 50
		if s == 0 {
			price = 7e17 // near the largest
		}
		day := 0
		for d := first; day < 20; d++ {
			if d.Weekday() == time.Saturday || d.Weekday() == time.Sunday {
				continue
			}
			price = min(price*(1+0.02*random.NormFloat64()), 9.2e18)
			c := priceCell{d, name, max(1, int64(price))}
			at := day
			switch random.IntN(12) {
			case 0: // late
				at += 1 + random.IntN(4)
			case 1: // wrong at first
				files[at] = append(files[at], priceCell{d, name, c.price/2 + 1})
				at += 1 + random.IntN(4)
			}
			files[at] = append(files[at], c)
			day++
		}
	}
	for _, f := range files {
		slices.SortFunc(f, func(a, b priceCell) int { return int(a.date) - int(b.date) })
	}
	return slices.DeleteFunc(files, func(f []priceCell) bool { return len(f) == 0 })
}

// returnsOfPrices is every return of the prices held, by series and date.
func returnsOfPrices(held map[string]map[rules.Date]int64) map[string]string {
	out := map[string]string{}
	for series, prices := range held {
		var dates []rules.Date
		for d := range prices {
			dates = append(dates, d)
		}
		slices.Sort(dates)
		for i := 1; i < len(dates); i++ {
			r := new(big.Rat).SetFrac64(prices[dates[i]], prices[dates[i-1]])
			r.Sub(r, big.NewRat(1, 1))
			out[series+" "+dates[i].String()] = roundHalfEven(r.Mul(r, big.NewRat(1e15, 1))).String()
		}
	}
	return out
}

func comparePrices(t *testing.T, f *folder, held map[string]map[rules.Date]int64, restated map[string]bool) {
	t.Helper()
	want := returnsOfPrices(held)
	seen := 0
	for series := range held {
		for _, row := range f.list("history", series) {
			key := series + " " + row["date"]
			seen++
			got, _ := new(big.Rat).SetString(row["return"])
			if text := got.Mul(got, big.NewRat(1e15, 1)).RatString(); text != want[key] {
				t.Errorf("%s: return is %s units, want %s", key, text, want[key])
			}
			if is := strings.Contains(row["why"], "restated"); is != restated[key] {
				t.Errorf("%s: restated is %v, want %v: %q", key, is, restated[key], row["why"])
			}
		}
	}
	if seen != len(want) {
		t.Errorf("%d returns, want %d", seen, len(want))
	}
	flagged := map[string]bool{}
	for _, row := range f.list("flags", "--all", "--kind", "restated") {
		flagged[row["series"]+" "+row["date"]] = true
	}
	for key := range restated {
		if !flagged[key] {
			t.Errorf("%s was restated, and no flag says so", key)
		}
	}
	if len(flagged) != len(restated) {
		t.Errorf("%d restated flags, want %d", len(flagged), len(restated))
	}
}
