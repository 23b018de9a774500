package main

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"time"

	"strayd/rules"
)

// demoConfig is the configuration of the invented book.
const demoConfig = `# An invented book. Paths are relative to this file.
ledger: ledger.db
feeds:
  - name: administrator
    files: inbox/*.csv
    unit: percent                 # 1.25 in the file is a return of 1.25 %
series: series.csv                # who is in which group
groups:
  - {name: equity}
  - {name: bond}
  - {name: cash}
ranges:
  - name: own                     # each fund's own last 60 returns
    watch: {tail: 1%}
    breach: {tail: 0.27%}
  - name: hard                    # whatever the past says
    limit: [-25%, 25%]
channels:
  - {name: console, console: {}}
`

// fund is one series of the invented book: what it is worth to know to invent its returns.
type fund struct {
	id, name, group   string
	drift, slope, own float64 // percent a day: mean, reaction to the group's factor, deviation of its own
}

// trees give the invented funds their names.
var trees = []string{"alder", "birch", "cedar", "dale", "elder", "fir", "gorse", "hazel"}

// book invents the returns of all funds, day by day, from a fixed seed.
type book struct {
	funds   []fund
	random  *rand.Rand
	history []rules.Date
	week    []rules.Date
}

func newBook() *book {
	b := &book{random: rand.New(rand.NewPCG(2026, 3))}
	for g, group := range []struct {
		name, style     string
		drift, dev, own float64
	}{{"equity", "growth", 0.03, 0.9, 0.25}, {"bond", "income", 0.01, 0.22, 0.08}, {"cash", "reserve", 0.009, 0.004, 0.003}} {
		for n, tree := range trees {
			b.funds = append(b.funds, fund{tree + "-" + group.style, strings.ToUpper(tree[:1]) + tree[1:] + " " + group.style, group.name,
				group.drift, group.dev * (0.7 + 0.08*float64(n)), group.own * (1 + 0.1*float64(g))})
		}
	}
	first, _ := rules.DateOf(2025, 3, 3)
	monday, _ := rules.DateOf(2026, 3, 9)
	for d := first; d < monday+5; d++ {
		switch d.Weekday() {
		case time.Saturday, time.Sunday:
			continue
		}
		if d < monday {
			b.history = append(b.history, d)
		} else {
			b.week = append(b.week, d)
		}
	}
	return b
}

func demoRegister() string {
	var s strings.Builder
	s.WriteString("series,name,group\n")
	for _, f := range newBook().funds {
		fmt.Fprintf(&s, "%s,%s,%s\n", f.id, f.name, f.group)
	}
	return s.String()
}

// heavy is a draw with tails heavier than normal and a deviation of about 1.
func (b *book) heavy() float64 {
	chi := 0.0
	for range 5 {
		n := b.random.NormFloat64()
		chi += n * n
	}
	return b.random.NormFloat64() / math.Sqrt(chi/5) * math.Sqrt(3.0/5)
}

// day invents the returns of one day in percent, in the order of the funds.
func (b *book) day() []float64 {
	factors := map[string]float64{"equity": b.heavy(), "bond": b.heavy(), "cash": b.heavy()}
	out := make([]float64, len(b.funds))
	for i, f := range b.funds {
		out[i] = f.drift + f.slope*factors[f.group] + f.own*b.heavy()
	}
	return out
}

// bookFile is one file that arrives, with what happens in it.
type bookFile struct {
	name, content, story string
	at                   time.Time
}

const bookHeader = "date,series,return\n"

func (b *book) rows(s *strings.Builder, d rules.Date, values []float64) {
	for i, f := range b.funds {
		fmt.Fprintf(s, "%s,%s,%.4f\n", d, f.id, values[i])
	}
}

func (b *book) at(id string) int {
	for i, f := range b.funds {
		if f.id == id {
			return i
		}
	}
	panic("no fund " + id)
}

// files invents the history and the week. Each day of the week has something planted.
func (b *book) files() []bookFile {
	var history strings.Builder
	history.WriteString(bookHeader)
	for _, d := range b.history {
		b.rows(&history, d, b.day())
	}
	out := []bookFile{{"history.csv", history.String(), "The first load: a year of history.", b.week[0].Time().Add(7 * time.Hour)}}
	plants := []struct {
		story string
		plant func(values []float64)
	}{
		{"An ordinary day.", func([]float64) {}},
		{"One row arrives a hundred times too large (planted).", func(v []float64) { v[b.at("cedar-growth")] = 128.4071 }},
		{"A distribution of 3.9 % is missing from one fund (planted).", func(v []float64) { v[b.at("birch-income")] -= 3.9 }},
		{"The file breaks off in the middle of a row (planted), and is sent again whole.", func([]float64) {}},
		{"Tuesday's row is corrected by its sender; a cash fund makes a move that is small, but not for cash (planted).",
			func(v []float64) { v[b.at("hazel-reserve")] = -0.4210 }},
	}
	for n, d := range b.week {
		values := b.day()
		plants[n].plant(values)
		var s strings.Builder
		s.WriteString(bookHeader)
		b.rows(&s, d, values)
		at := d.Time().Add(18*time.Hour + 30*time.Minute)
		name := fmt.Sprintf("returns-%s.csv", d)
		switch n {
		case 3:
			whole := s.String()
			broken := whole[:len(whole)-len("hazel-reserve,0.0000\n")] + "hazel-res"
			out = append(out, bookFile{name, broken, plants[n].story, at})
			out = append(out, bookFile{name, whole, "The same file, whole.", at.Add(20 * time.Minute)})
			continue
		case 4:
			fmt.Fprintf(&s, "%s,cedar-growth,1.2841\n", b.week[1])
		}
		out = append(out, bookFile{name, s.String(), plants[n].story, at})
	}
	return out
}
