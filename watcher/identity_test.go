package watcher_test

import (
	"math/rand/v2"
	"testing"

	"strayd/rules"
)

// A ledger whose ranges are identified by a text that this version of the program would not write: they are numbered anew and
// replayed, so that what comes next is judged, and judged right.
func TestRangesIdentifiedOtherwise(t *testing.T) {
	files := randomFiles(rand.New(rand.NewPCG(4, 4)), 30, 50, false)
	before, after := &shelf{map[string][]entry{}}, &shelf{map[string][]entry{}}
	for n, name := range sortedFiles(&shelf{files}) {
		if n < 40 {
			before.files[name] = files[name]
		} else {
			after.files[name] = files[name]
		}
	}
	settings := rules.Settings{Ranges: []rules.Range{ranged("t5", nil)}}
	m := &memory{}
	run(t, m, before, settings, 2)
	for _, b := range m.batches {
		for n := range b.NewRanges {
			b.NewRanges[n].Key += " as another version writes it"
		}
	}
	run(t, m, after, settings, 2)
	d := newDefinition(t, m)
	d.counts(after, func(file string) bool { return after.files[file] != nil })
	if c := m.passes[1].Counts; c.Inside == 0 {
		t.Errorf("nothing was judged: %+v", c)
	}
}
