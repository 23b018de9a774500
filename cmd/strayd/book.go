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
    schedule: "*/10 17-20 * * mon-fri"
    due: {at: "19:30"}            # whole by then, or the feed is late
    unit: percent                 # 1.25 in the file is a return of 1.25 %
series: series.csv                # who is in which group
events: events.csv                # distributions and splits that are known
groups:                           # each fund is held against the median of its group
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

// demoEvents are the events that are known: one distribution, in the week.
func demoEvents() string {
	return fmt.Sprintf("date,series,kind,amount\n%s,birch-income,distribution,0.039\n", newBook().week[3])
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

// scene is one thing that happens in the demo's week.
type scene struct {
	at      time.Time
	story   string
	name    string     // of a file that arrives; "" for none
	content string     // of it
	due     rules.Date // the date whose deadline passes; NoDate for none
	line    bool       // the daily line is due
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

// file invents the file of a day, with something planted in its values.
func (b *book) file(d rules.Date, plant func(values []float64)) string {
	values := b.day()
	plant(values)
	var s strings.Builder
	s.WriteString(bookHeader)
	b.rows(&s, d, values)
	return s.String()
}

func (b *book) past() string {
	var s strings.Builder
	s.WriteString(bookHeader)
	for _, d := range b.history {
		b.rows(&s, d, b.day())
	}
	return s.String()
}

// scenes invent the history and the week. Each day of the week has something planted.
func (b *book) scenes() []scene {
	out := []scene{{at: clock(b.week[0], 7, 0), story: "The first load: a year of history.", name: "history.csv", content: b.past(), due: rules.NoDate}}
	arrives := func(day, hour, minute int, story, content string) {
		d := b.week[day]
		out = append(out, scene{clock(d, hour, minute), story, fmt.Sprintf("returns-%s.csv", d), content, rules.NoDate, false})
	}
	line := func(day int) {
		out = append(out, scene{at: clock(b.week[day], 20, 30), story: "The day's last word.", due: rules.NoDate, line: true})
	}
	nothing := func([]float64) {}
	arrives(0, 18, 30, "An ordinary day.", b.file(b.week[0], nothing))
	line(0)
	right := 0.0
	arrives(1, 18, 30, "One row is a hundred times too large (planted).", b.file(b.week[1], func(v []float64) {
		right = math.Round(v[b.at("cedar-growth")]*1e4) / 1e4
		v[b.at("cedar-growth")] = 100 * right
	}))
	line(1)
	whole := b.file(b.week[2], nothing)
	arrives(2, 18, 30, "The file breaks off in the middle of a row (planted).", whole[:len(whole)-len("hazel-reserve,0.0000\n")]+"hazel-res")
	arrives(2, 18, 50, "It is sent again, whole.", whole)
	line(2)
	out = append(out, scene{at: clock(b.week[3], 19, 30), story: "The deadline passes and no file is there (planted).", due: b.week[3]})
	last := 0.0
	arrives(3, 19, 50, "It comes; the distribution of 3.9 % that one fund paid today is missing (planted).",
		b.file(b.week[3], func(v []float64) {
			v[b.at("birch-income")] -= 3.9
			last = v[b.at("alder-growth")]
		}))
	line(3)
	storm := b.file(b.week[4], func(v []float64) {
		for i, f := range b.funds {
			switch f.group {
			case "equity":
				v[i] -= 5.5 * f.slope
			case "bond":
				v[i] += 5 * f.slope
			}
		}
		v[b.at("alder-growth")] = last
	})
	arrives(4, 18, 30, "Shares fall and bonds rise, and one fund repeats yesterday's return (planted); the sender also corrects Tuesday's row.",
		storm+fmt.Sprintf("%s,cedar-growth,%.4f\n", b.week[1], right))
	line(4)
	return out
}

func clock(d rules.Date, hour, minute int) time.Time {
	return d.Time().Add(time.Duration(hour)*time.Hour + time.Duration(minute)*time.Minute)
}
