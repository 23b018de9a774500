package main

import (
	"cmp"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"time"

	"strayd/rules"
)

// invented is a small random book: what is true in the end, in the order of its dates and series.
type invented struct {
	random *rand.Rand
	dates  []rules.Date
	rows   []bookRow
}

// invent makes a book of 10 to 40 series and 30 to 200 dates with what real books bring: series that start late, go dormant and come
// back, holes, constant runs, values a hundred times too large, and values beyond what may enter a window.
func invent(seed uint64) *invented {
	b := &invented{random: rand.New(rand.NewPCG(seed, 1))}
	d, _ := rules.DateOf(2024, 1, 1)
	for n := 30 + b.random.IntN(171); len(b.dates) < n; d++ {
		if day := d.Weekday(); day != time.Saturday && day != time.Sunday && b.random.IntN(25) > 0 {
			b.dates = append(b.dates, d)
		}
	}
	for n := range 10 + b.random.IntN(31) {
		b.invent(fmt.Sprintf("series-%02d", n))
	}
	slices.SortFunc(b.rows, inOrder)
	return b
}

func inOrder(x, y bookRow) int {
	return cmp.Or(cmp.Compare(x.date, y.date), strings.Compare(x.series, y.series))
}

// invent makes one series.
func (b *invented) invent(name string) {
	r := b.random
	deviation := []float64{1e-5, 1e-4, 0.002, 0.01, 0.03}[r.IntN(5)]
	places := []int{4, 6, 8, 15}[r.IntN(4)]
	from, rest, back := 0, len(b.dates), len(b.dates)
	if r.IntN(3) == 0 {
		from = r.IntN(len(b.dates))
	}
	if r.IntN(4) == 0 {
		rest = r.IntN(len(b.dates))
		back = rest + 15 + r.IntN(20)
	}
	constant, value := 0, rules.Units(0)
	for i, d := range b.dates {
		if i < from || i >= rest && i < back || r.IntN(30) == 0 {
			continue
		}
		if constant > 0 {
			constant--
		} else {
			value = b.value(deviation, places)
			if r.IntN(60) == 0 {
				constant = r.IntN(80)
			}
		}
		b.rows = append(b.rows, bookRow{d, name, value})
	}
}

func (b *invented) value(deviation float64, places int) rules.Units {
	x := b.random.NormFloat64() * deviation
	switch b.random.IntN(40) {
	case 0, 1:
		x *= 5
	case 2:
		x *= 100
	case 3:
		x *= 2.5
	}
	switch b.random.IntN(400) {
	case 0:
		x = 100 + b.random.Float64()*500 // never enters a window
	case 1:
		x = -100 // the largest that does
	}
	step := int64(math.Pow10(15 - places))
	return rules.Units(int64(math.Round(x*math.Pow10(places))) * step)
}

// daily is the book as one file a date.
func (b *invented) daily() (files [][]bookRow) {
	for _, c := range b.rows {
		if n := len(files); n == 0 || files[n-1][0].date != c.date {
			files = append(files, nil)
		}
		files[len(files)-1] = append(files[len(files)-1], c)
	}
	return files
}

// chunks is the same content, in order, in files of random numbers of dates.
func (b *invented) chunks() (files [][]bookRow) {
	room := 0
	for _, day := range b.daily() {
		if room--; room < 0 {
			room = b.random.IntN(30)
			files = append(files, nil)
		}
		files[len(files)-1] = append(files[len(files)-1], day...)
	}
	return files
}

// rough is the book as it may arrive: some values days late, some whole dates late, some wrong at first and restated later, once or
// twice, some repeated unchanged.
func (b *invented) rough() (files [][]bookRow) {
	days := b.daily()
	files = make([][]bookRow, len(days)+40)
	put := func(at int, c bookRow) {
		at = min(at, len(files)-1)
		for _, have := range files[at] {
			if have.date == c.date && have.series == c.series {
				return
			}
		}
		files[at] = append(files[at], c)
	}
	for i, day := range days {
		lateDay := 0
		if b.random.IntN(25) == 0 {
			lateDay = 1 + b.random.IntN(30)
		}
		for _, c := range day {
			at := i + lateDay
			switch b.random.IntN(50) {
			case 0:
				at += 1 + b.random.IntN(35)
			case 1: // wrong at first
				wrong := c
				wrong.value = c.value*-3 + rules.Units(b.random.IntN(7)-3)*1e9
				put(at, wrong)
				at += 1 + b.random.IntN(20)
			case 2: // right, then wrong, then right again
				put(at, c)
				wrong := c
				wrong.value = c.value / 7
				put(at+2, wrong)
				at += 5
			case 3:
				put(at+3, c)
			}
			put(at, c)
		}
	}
	for _, f := range files {
		slices.SortFunc(f, inOrder)
	}
	return slices.DeleteFunc(files, func(f []bookRow) bool { return len(f) == 0 })
}

// fileText writes rows as a long file of fractions.
func fileText(rows []bookRow) string {
	var b strings.Builder
	b.WriteString("date,series,return\n")
	for _, c := range rows {
		whole, rest, sign := c.value/1e15, c.value%1e15, ""
		if c.value < 0 {
			whole, rest, sign = -whole, -rest, "-"
		}
		fmt.Fprintf(&b, "%s,%s,%s%d.%015d\n", c.date.Time().Format(time.DateOnly), c.series, sign, whole, rest)
	}
	return b.String()
}

// inventRanges chooses settings: some of every scale, tail, side and way to treat pending values.
func inventRanges(random *rand.Rand) []oracleRange {
	one := oracleLine{p: 0.01}
	rare := oracleLine{p: 0.0027}
	pool := []oracleRange{
		{name: "own", scale: "plain", tail: "t5", predictive: true, watch: one, breach: rare, text: ""},
		{name: "narrow", scale: "plain", tail: "normal", watch: oracleLine{z: 2}, breach: oracleLine{z: 3},
			text: ", tail: normal, predictive: false, watch: {z: 2}, breach: {z: 3}"},
		{name: "predictive", scale: "plain", tail: "predictive-t", predictive: true, watch: oracleLine{p: 0.05}, breach: one,
			text: ", tail: predictive-t, watch: {confidence: 95%}, breach: {confidence: 99%}"},
		{name: "weighted", scale: "weighted", tail: "normal", predictive: true, watch: one, breach: rare, text: ", scale: weighted, tail: normal"},
		{name: "mad", scale: "mad", tail: "t5", predictive: true, watch: one, breach: oracleLine{z: 4}, text: ", scale: mad, breach: {z: 4}"},
		{name: "rank", scale: "plain", tail: "rank", predictive: true, watch: oracleLine{p: 0.21}, breach: oracleLine{p: 0.11},
			text: ", tail: rank, watch: {tail: 21%}, breach: {tail: 11%}"},
		{name: "ranklow", scale: "mad", tail: "rank", predictive: true, watch: oracleLine{p: 0.2}, breach: oracleLine{p: 0.08},
			text: ", tail: rank, scale: mad, watch: {tail: 20%}, breach: {tail: 8%}"},
	}
	random.Shuffle(len(pool), func(i, j int) { pool[i], pool[j] = pool[j], pool[i] })
	out := pool[:2+random.IntN(3)]
	for n := range out {
		r := &out[n]
		r.side = []string{"both", "both", "lower", "upper"}[random.IntN(4)]
		r.pending = []string{"clip", "clip", "keep", "leave-out"}[random.IntN(4)]
		r.window = 20 + random.IntN(41)
		r.text = fmt.Sprintf("  - {name: %s, window: %d, side: %s, pending: %s%s}\n", r.name, r.window, r.side, r.pending, r.text)
	}
	if random.IntN(2) == 0 {
		out = append(out, oracleRange{name: "hard", limit: true, low: -2e14, high: 5e14, text: "  - {name: hard, limit: [-20%, 50%]}\n"})
	}
	return out
}

func rangesText(ranges []oracleRange) string {
	text := "doubtful: 0%\nranges:\n" // the oracle judges ranges; what may lie behind a value is not its business
	for _, r := range ranges {
		text += r.text
	}
	return text
}
