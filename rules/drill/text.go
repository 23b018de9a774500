package drill

import (
	"encoding/csv"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"strayd/rules"
)

// percentPlaces is how many decimals of a per cent a unit stands for.
const percentPlaces = rules.Places - 2

// InPercent writes a return as a series prints it: per cent with the decimals of its tick.
func (s *Series) InPercent(u rules.Units) string {
	text := rules.Decimal(int64(u), percentPlaces)
	places := percentPlaces
	for tick := s.Tick; tick >= 10 && places > 0; tick /= 10 {
		places--
	}
	if places == 0 {
		return text
	}
	whole, frac, _ := strings.Cut(text, ".")
	return whole + "." + frac + strings.Repeat("0", max(0, places-len(frac)))
}

// TickOf is the last digit that values are printed with: the largest power of ten that divides them all, at most 0.01 % and at least a
// unit.
func TickOf(values []rules.Units) rules.Units {
	tick := hundredth
	for _, u := range values {
		for u != rules.Missing && u%tick != 0 {
			tick /= 10
		}
	}
	return tick
}

// Text is the content of a feed's file with the dates from..to, the last excluded, in the long layout: date, series, return in per cent.
// rows is how many rows it has.
func (b *Book) Text(feed string, from, to int) (text string, rows int) {
	var out strings.Builder
	w := csv.NewWriter(&out)
	line := []string{"date", "series", "return"}
	w.Write(line) //nolint:errcheck // a builder takes everything
	of := b.of(feed)
	for t := from; t < to; t++ {
		line[0] = b.Dates[t].String()
		for _, s := range of {
			if u := b.Values[t][s]; u != rules.Missing {
				line[1], line[2] = b.Series[s].ID, b.Series[s].InPercent(u)
				w.Write(line) //nolint:errcheck // as above
				rows++
			}
		}
	}
	w.Flush()
	return out.String(), rows
}

// Broken is the content of a file that breaks off: the rows of one date up to a share of them, the last one torn or whole.
func (b *Book) Broken(feed string, at int, share float64, torn bool) string {
	text, rows := b.Text(feed, at, at+1)
	lines := strings.SplitAfter(text, "\n")
	keep := 1 + min(max(1, int(share*float64(rows))), rows)
	out := strings.Join(lines[:keep], "")
	if torn {
		out = out[:len(out)-3]
	}
	return out
}

// RegisterText is the register of the book's series.
func (b *Book) RegisterText() string {
	var out strings.Builder
	out.WriteString("series,group,reference,fx\n")
	for i := range b.Series {
		s := &b.Series[i]
		name := func(at int) string {
			if at < 0 {
				return ""
			}
			return b.Series[at].ID
		}
		fmt.Fprintf(&out, "%s,%s,%s,%s\n", s.ID, s.Group, name(s.Reference), name(s.FX))
	}
	return out.String()
}

// EventsText is the calendar of distributions and splits.
func (b *Book) EventsText() string {
	events := slices.Clone(b.Events)
	slices.SortStableFunc(events, func(a, b rules.Event) int { return int(a.Date) - int(b.Date) })
	var out strings.Builder
	out.WriteString("date,series,kind,amount\n")
	for _, e := range events {
		fmt.Fprintf(&out, "%s,%s,%s,%s\n", e.Date, e.Series, e.Kind, strconv.FormatFloat(e.Amount, 'f', -1, 64))
	}
	return out.String()
}

// InventedConfig is a configuration for an invented book with everything at its default. The benchmarks' feed comes first, so that their
// values are there when the funds' are judged.
const InventedConfig = `# An invented book. Paths are relative to this file.
ledger: ledger.db
feeds:
  - {name: index, files: "inbox/index-*.csv", unit: percent, due: {at: "18:30"}}
  - {name: administrator, files: "inbox/administrator-*.csv", unit: percent, due: {at: "19:30"}}
series: series.csv
events: events.csv
groups:
  - {name: north, reference: north-index}
  - {name: south, reference: south-index}
  - {name: east, reference: peers}
  - {name: west, reference: peers}
ranges:
  - {name: own}
  - {name: residual, of: residual}
`
