package watcher_test

import (
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/rules"
)

// loadBoth gives a desk histories of both feeds, then a day at a time up to a date.
func (b *gated) loadBoth(d *desk, n, upto int) {
	d.t.Helper()
	var index []entry
	for k := range n {
		index = append(index, b.index(k, same)...)
	}
	d.give("indices", "index.csv", index)
	d.give("funds", "history.csv", b.history(n))
	for k := n; k < upto; k++ {
		b.day(d, k, same, same)
	}
}

// day gives the files of one date, the index first.
func (b *gated) day(d *desk, n int, index, funds func(int, float64) float64) {
	d.t.Helper()
	d.give("indices", "index-"+b.dates[n].String()+".csv", b.index(n, index))
	d.give("funds", dayName(b.dates[n]), b.file(n, funds))
}

// A file whose dates are a day off for five days is refused as such: on the first it repeats the day before, then its values fit the
// indices of the day before. A day or two on which the indices moved alike may pass.
func TestShiftedFiles(t *testing.T) {
	if testing.Short() {
		t.Skip("many passes")
	}
	seeds, caught := 6, 0
	if testing.Short() {
		seeds = 3
	}
	for seed := range seeds {
		b := newGated(200+uint64(seed), 24, 150, 2+2*(seed%2))
		d := newDesk(t)
		d.settings.References = b.references()
		b.loadBoth(d, 130, 140)
		since := len(d.store.batches)
		for k := 140; k < 145; k++ {
			d.give("indices", "index-"+b.dates[k].String()+".csv", b.index(k, same))
			rows := b.file(k-1, same)
			for i := range rows {
				rows[i].date = b.dates[k]
			}
			d.give("funds", dayName(b.dates[k]), rows)
		}
		got := d.raised(since)
		if len(got) == 0 || got[0] != "refused repeat" {
			t.Errorf("seed %d: raised %v", seed, got)
		}
		for _, s := range got[1:] {
			if s == "refused shifted-date" {
				caught++
			}
		}
		since = len(d.store.batches)
		for k := 145; k < 150; k++ {
			b.day(d, k, same, same)
		}
		if got := slices.DeleteFunc(d.raised(since), func(s string) bool { return s == "missing" }); len(got) > 0 {
			t.Errorf("seed %d: then raised %v", seed, got)
		}
	}
	if caught < 3*seeds {
		t.Errorf("%d of %d shifted files refused as such", caught, 4*seeds)
	}
}

// A wrong index, whatever is wrong with it, does not refuse the funds' file.
func TestWrongIndexRefusesNoFile(t *testing.T) {
	if testing.Short() {
		t.Skip("many passes")
	}
	wrong := []func(int, float64) float64{
		scaled(-1), scaled(100), scaled(0.01), scaled(0),
		func(i int, v float64) float64 { return v + 0.01*float64(1-2*(i%2)) },
	}
	for seed, plant := range wrong {
		b := newGated(300+uint64(seed), 24, 145, 4)
		d := newDesk(t)
		d.settings.References = b.references()
		b.loadBoth(d, 130, 135)
		since := len(d.store.batches)
		for k := 135; k < 145; k++ {
			index := same
			if k == 136 || k == 139 || k == 140 {
				index = plant
			}
			b.day(d, k, index, same)
		}
		for _, s := range d.raised(since) {
			if s != string(rules.KindMarketDay) {
				t.Errorf("fault %d: raised %s: %v", seed, s, d.reasons())
			}
		}
	}
}

// On random days no file is refused as shifted, also after a date that is not there.
func TestNoShiftOfOrdinaryFiles(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 9))
	b := newGated(400, 24, 190, 4)
	d := newDesk(t)
	d.settings.References = b.references()
	b.loadBoth(d, 130, 131)
	for k := 131; k < 190; k++ {
		d.give("indices", "index-"+b.dates[k].String()+".csv", b.index(k, same))
		if r.IntN(6) > 0 {
			d.give("funds", dayName(b.dates[k]), b.file(k, same))
		}
	}
	for _, s := range d.raised(0) {
		if s == "refused shifted-date" || s == "refused" {
			t.Errorf("raised %s", s)
		}
	}
}
