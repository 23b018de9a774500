package drill

import (
	"math"
	"reflect"
	"testing"

	"strayd/rules"
)

// The shape of the book is that of the issue: 60 funds in 4 groups of 15, two groups with a benchmark from another feed, 750 business days,
// betas 0.6 to 1.3, residual deviation 0.15 % for half and 0.3 % for half.
func TestInventedBook(t *testing.T) {
	b := Invent(Invention{Seed: 1})
	if len(b.Dates) != 750 || len(b.Series) != 62 {
		t.Fatalf("%d dates, %d series, want 750 and 62", len(b.Dates), len(b.Series))
	}
	groups, bases, tight, fine := map[string]int{}, map[string]int{}, 0, 0
	for s := range b.Series {
		of := &b.Series[s]
		if of.Helper {
			if of.Feed == FundsFeed {
				t.Errorf("%s comes by the feed of the funds", of.ID)
			}
			continue
		}
		groups[of.Group]++
		bases[of.Basis()]++
		if of.Residual == 0.0015 {
			tight++
		}
		if of.Fine() {
			fine++
		}
		if of.Beta < 0.6 || of.Beta > 1.3 {
			t.Errorf("%s: beta %v", of.ID, of.Beta)
		}
	}
	want := map[string]int{"north": 15, "south": 15, "east": 15, "west": 15}
	if !reflect.DeepEqual(groups, want) || bases["benchmark"] != 30 || bases["peers"] != 30 {
		t.Errorf("groups %v, bases %v", groups, bases)
	}
	if tight < 28 || tight > 32 || fine < 28 || fine > 32 {
		t.Errorf("%d with the small residual, %d with four decimals, want about 30 each of 60", tight, fine)
	}
}

// The fit finds the slope and the residual deviation that the book was made with, within sampling error (a loose tenth), and factors have
// about 1 % deviation with heavy tails: the kurtosis is above the normal's 3.
func TestInventedReturns(t *testing.T) {
	for seed := range uint64(8) {
		b := Invent(Invention{Seed: seed})
		fits := NewFits(b)
		var sum float64
		for s := range b.Series {
			of, fit := &b.Series[s], fits.Of[s]
			if of.Reference < 0 {
				continue
			}
			if math.Abs(fit.Beta-of.Beta) > 0.1 || fit.Deviation < 0.6*of.Residual || fit.Deviation > 2*of.Residual {
				t.Errorf("seed %d %s: fit %+v, made with %v and %v", seed, of.ID, fit, of.Beta, of.Residual)
			}
			sum += fit.Deviation / of.Residual
		}
		if mean := sum / 30; mean < 0.85 || mean > 1.2 {
			t.Errorf("seed %d: residual deviations are %v of those asked for", seed, mean)
		}
		if dev, kurtosis := moments(b, 0); dev < 0.005 || dev > 0.02 || kurtosis < 3 {
			t.Errorf("seed %d: factor deviation %v, kurtosis %v", seed, dev, kurtosis)
		}
	}
}

func moments(b *Book, s int) (dev, kurtosis float64) {
	var m2, m4 float64
	for _, row := range b.Values {
		r := row[s].Float()
		m2 += r * r
		m4 += r * r * r * r
	}
	n := float64(len(b.Values))
	return math.Sqrt(m2 / n), m4 / n / (m2 / n * m2 / n)
}

func draw(t *testing.T, seed uint64, kinds []Kind, i Invention) (*Book, *Plan) {
	t.Helper()
	b := Invent(i)
	return b, Draw(b, NewFits(b), Options{Seed: seed, Kinds: kinds, From: 300})
}

// The same seed gives the same plan, another seed another one, and the book stays as it is.
func TestPlansAreReproducible(t *testing.T) {
	for _, kinds := range Rounds(Kinds) {
		b := Invent(Invention{Seed: 3, FX: true})
		before := b.Clone()
		fits := NewFits(b)
		p := Draw(b, fits, Options{Seed: 7, Kinds: kinds, From: 300})
		p.Apply(b)
		if !reflect.DeepEqual(b.Values, before.Values) || !reflect.DeepEqual(b.Events, before.Events) {
			t.Error("the book was changed")
		}
		if q := Draw(b, fits, Options{Seed: 7, Kinds: kinds, From: 300}); !reflect.DeepEqual(p, q) {
			t.Error("the same seed gave another plan")
		}
		if q := Draw(b, fits, Options{Seed: 8, Kinds: kinds, From: 300}); reflect.DeepEqual(p.Plants, q.Plants) {
			t.Error("another seed gave the same plan")
		}
	}
}

// Every kind is planted, plants of a series lie apart, no two lie in a group on one date, and nothing else differs from the book.
func TestPlantsLieApart(t *testing.T) {
	count := map[Kind]int{}
	for _, kinds := range Rounds(Kinds) {
		b, p := draw(t, 11, kinds, Invention{Seed: 11, FX: true})
		out := p.Apply(b)
		held := map[Cell]bool{}
		group := map[[2]any]Kind{}
		for i := range p.Plants {
			q := &p.Plants[i]
			count[q.Kind]++
			for _, c := range q.Cells {
				held[Cell{c.At, c.Series, 0}] = true
			}
			for j := range p.Plants {
				r := &p.Plants[j]
				if i != j && q.Series >= 0 && q.Series == r.Series && r.At >= q.At && r.At < q.last()+20 {
					t.Errorf("%+v and %+v are too near", q, r)
				}
			}
			for at := q.At; q.Series >= 0 && at <= q.last(); at++ {
				key := [2]any{b.Series[q.Series].Group, at}
				if other, ok := group[key]; ok && key[0] != "" {
					t.Errorf("%s and %s in group %v on date %d", q.Kind, other, key[0], at)
				}
				group[key] = q.Kind
			}
		}
		for at, row := range b.Values {
			for s, u := range row {
				if out.Values[at][s] != u && !held[Cell{at, s, 0}] {
					t.Fatalf("date %d series %d differs without a plant", at, s)
				}
			}
		}
	}
	for _, k := range Kinds {
		if count[k] < 3 {
			t.Errorf("%s was planted %d times", k, count[k])
		}
	}
	t.Log(count)
}

// What each kind does to numbers that are easy to check by hand, in per cent at two decimals.
func TestChangesByHand(t *testing.T) {
	for _, c := range []struct {
		kind Kind
		true []int64 // hundredths of a per cent, from the day before on
		want []int64
	}{
		{X100, []int64{10, 25}, []int64{2500}},
		{X10, []int64{10, -25}, []int64{-250}},
		{X10000, []int64{10, 25}, []int64{250000}},
		{Div100, []int64{10, 149}, []int64{1}},
		{Div100, []int64{10, -150}, []int64{-2}},
		{Sign, []int64{10, 25}, []int64{-25}},
		{Repeat, []int64{10, 25}, []int64{10}},
		{Zero, []int64{10, 25}, []int64{0}},
		{MissedListed, []int64{10, 25}, []int64{-55}},
		{MissedNot, []int64{10, 25}, []int64{-55}},
		{Doubled, []int64{10, 25}, []int64{105}},
		// 1.01, 1.01 x 0.98 = 0.9898, x 1.03 = 1.019494, x 1 = 1.019494, x 1.005 = 1.02459147
		{Cumulative, []int64{0, 100, -200, 300, 0, 50}, []int64{100, -102, 195, 195, 246}},
	} {
		b := oneFund(c.true)
		p := &Plant{Kind: c.kind, Series: 0, Partner: -1, At: 1, Days: natureOf(c.kind).days}
		if !(&change{book: b, p: p}).make() {
			t.Errorf("%s: not planted", c.kind)
			continue
		}
		for i, want := range c.want {
			if got := p.Cells[i].Value; got != rules.Units(want)*hundredth {
				t.Errorf("%s of %v, day %d: %s, want %d hundredths of a per cent", c.kind, c.true, i, got, want)
			}
		}
		if listed := len(p.Listed) == 1; listed != (c.kind == MissedListed || c.kind == Doubled) {
			t.Errorf("%s: listed %v", c.kind, p.Listed)
		}
	}
}

func oneFund(hundredths []int64) *Book {
	b := &Book{Series: []Series{{ID: "a", Reference: -1, FX: -1, Tick: hundredth}}}
	for i, v := range hundredths {
		b.Dates = append(b.Dates, rules.Date(i))
		b.Values = append(b.Values, []rules.Units{rules.Units(v) * hundredth})
	}
	return b
}

// A repeat of an equal value, a zero for a zero and a flip of zero change nothing and are not planted.
func TestNothingIsPlantedInVain(t *testing.T) {
	for _, c := range []struct {
		kind Kind
		true []int64
	}{
		{Repeat, []int64{25, 25}}, {Repeat, []int64{0, 25}}, {Zero, []int64{25, 0}}, {Zero, []int64{0, 25}}, {Sign, []int64{1, 0}}, {X100, []int64{1, 0}},
	} {
		p := &Plant{Kind: c.kind, Series: 0, Partner: -1, At: 1, Days: 1}
		if (&change{book: oneFund(c.true), p: p}).make() {
			t.Errorf("%s planted in %v", c.kind, c.true)
		}
	}
}
