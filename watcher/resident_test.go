package watcher_test

import (
	"fmt"
	"math/rand/v2"
	"reflect"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// Passes that go on from what the passes before left in memory publish what passes publish that read everything: over books with holes,
// gaps, late and restated values, where a step comes in between, and after a file that is refused on its way.
func TestResidentChangesNothing(t *testing.T) {
	for seed := range uint64(6) {
		t.Run(fmt.Sprintf("seed %d", seed), func(t *testing.T) {
			r := rand.New(rand.NewPCG(seed, 90))
			files := randomFiles(r, 10+r.IntN(120), 60+r.IntN(30), seed%4 == 3)
			if seed%2 == 0 { // mostly whole, so that most windows share their dates
				for name, rows := range files {
					if r.IntN(6) > 0 {
						files[name] = whole(rows, 130)
					}
				}
			}
			plain, weighted := ranged("t5", nil), ranged("t5", nil)
			plain.Window, weighted.Name, weighted.Scale, weighted.Decay = 5+r.IntN(40), "weighted", rules.Weighted, 0.94
			settings := rules.Settings{Ranges: []rules.Range{plain, weighted}}
			with, without := &memory{}, &memory{}
			var kept watcher.Resident
			for n, name := range sortedFiles(&shelf{files}) {
				if n == 50 && seed%3 == 0 { // a step that the resident knows nothing of
					settings.Ranges[0].Window++
				}
				one := &shelf{map[string][]entry{name: files[name]}}
				workers := 1 + int(seed%3)
				runWith(t, with, one, settings, workers, &kept)
				run(t, without, one, settings, workers)
			}
			if len(with.batches) != len(without.batches) {
				t.Fatalf("%d steps with, %d without", len(with.batches), len(without.batches))
			}
			for n := range with.batches {
				if !reflect.DeepEqual(with.batches[n], without.batches[n]) {
					t.Fatalf("step %d differs: %s", n+1, difference(with.batches[n], without.batches[n]))
				}
			}
		})
	}
}

// whole fills a file up with a value of every series on its newest date.
func whole(rows []entry, series int) []entry {
	there := map[string]bool{}
	newest := rules.NoDate
	for _, e := range rows {
		if e.date > newest {
			newest, there = e.date, map[string]bool{}
		}
		if e.date == newest {
			there[e.series] = true
		}
	}
	for s := range series {
		if name := fmt.Sprintf("group%d-%05d", s%3, s); !there[name] {
			rows = append(rows, entry{newest, name, rules.Units(1e10 * int64(s%97-48)), 0})
		}
	}
	return rows
}

// difference names what differs of two batches.
func difference(a, b *watcher.Batch) (out string) {
	x, y := reflect.ValueOf(*a), reflect.ValueOf(*b)
	for i := range x.NumField() {
		if reflect.DeepEqual(x.Field(i).Interface(), y.Field(i).Interface()) {
			continue
		}
		out += x.Type().Field(i).Name + " "
		if f, ok := x.Field(i).Interface().([]*watcher.FlagRow); ok && len(f) == len(b.Flags) {
			for n := range f {
				if !reflect.DeepEqual(f[n], b.Flags[n]) {
					return fmt.Sprintf("%s%+v, without %+v", out, *f[n], *b.Flags[n])
				}
			}
		}
		if c := x.Field(i); c.Kind() != reflect.Slice {
			out += fmt.Sprintf("%+v, without %+v ", c.Interface(), y.Field(i).Interface())
		}
	}
	return out
}
