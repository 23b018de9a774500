package backrun

import (
	"slices"
	"testing"

	"strayd/rules"
)

func flag(series string, date rules.Date, kind rules.Kind) rules.Flag {
	return rules.Flag{Series: series, Group: "g", Date: date, Kind: kind}
}

func decided(f rules.Flag, c rules.Conclusion) rules.Flag {
	f.Decided = &rules.Act{Conclusion: c}
	return f
}

// Two sides whose flags are worked out by hand.
func comparison() *Comparison {
	d := dates(10) // two calendar weeks
	market := rules.Flag{Group: "g", Date: d[6], Kind: rules.KindMarketDay}
	old := decided(flag("alder", d[0]-7, rules.KindBreach), rules.Genuine)
	return &Comparison{Dates: d, Sides: []*Side{
		{Flags: []rules.Flag{flag("alder", d[0], rules.KindBreach), flag("birch", d[1], rules.KindDoubtful), flag("cedar", d[6], rules.KindBreach)}},
		{Flags: []rules.Flag{flag("alder", d[0], rules.KindBreach), flag("alder", d[0], rules.KindLimit), flag("birch", d[1], rules.KindBreach),
			flag("dale", d[6], rules.KindBreach), market, flag("elder", d[7], rules.KindStale)}}},
		Issued: []rules.Flag{decided(flag("alder", d[0], rules.KindBreach), rules.Genuine), decided(flag("cedar", d[6], rules.KindBreach), rules.Erroneous),
			decided(flag("dale", d[6], rules.KindBreach), rules.Genuine), decided(flag("elder", d[7], rules.KindRepeat), rules.Corrected),
			flag("elder", d[8], rules.KindRepeat), old, decided(flag("fir", d[2], rules.KindMissing), rules.Genuine)}}
}

func TestCounts(t *testing.T) {
	want := map[string][]int{"all": {3, 6}, "breach": {2, 3}, "limit": {0, 1}, "doubtful": {1, 0}, "stale": {0, 1}, "market-day": {0, 1},
		// The other side: alder's two flags are one event, birch, the market day with dale's breach, elder.
		"events": {3, 4}, "busiest week": {2, 3}, "g all": {3, 6}}
	got := comparison().Counts()
	for _, c := range got {
		name := string(c.Kind)
		if c.Group != "" {
			name = c.Group + " " + name
		}
		if !slices.Equal(c.Flags, want[name]) {
			t.Errorf("%s: %v, want %v", name, c.Flags, want[name])
		}
	}
	if len(got) != len(want) {
		t.Errorf("%d counts, want %d", len(got), len(want))
	}
}

func TestChanges(t *testing.T) {
	c := comparison()
	got, kept := c.Changes()
	if kept != 2 {
		t.Errorf("%d kept, want 2: alder and birch", kept)
	}
	var words []string
	for _, x := range got {
		word := string(x.Turn) + " " + x.Flag.Series + " " + string(x.Flag.Kind) + " " + string(x.Before)
		if x.Issued != nil {
			word += " issued " + string(x.Issued.Kind)
		}
		words = append(words, word)
	}
	want := []string{"other kind birch breach doubtful", "appears  market-day ", "vanishes cedar breach  issued breach", "appears dale breach  issued breach",
		"appears elder stale  issued repeat"}
	if !slices.Equal(words, want) {
		t.Errorf("%q,\nwant %q", words, want)
	}
	if one := (&Comparison{Dates: c.Dates, Sides: c.Sides[:1]}); len(first(one.Changes())) != 0 {
		t.Error("one side has changes")
	}
}

func first(c []Change, _ int) []Change { return c }

// What was decided of dates before, and of files, is not counted.
func TestDecisionsForAndAgainst(t *testing.T) {
	got := comparison().Decisions()
	want := []Decision{{rules.Genuine, 2, []int{1, 2}, 1, 0}, {rules.Erroneous, 1, []int{1, 0}, 0, 1}, {rules.Corrected, 1, []int{0, 1}, 1, 0}}
	for n, d := range got {
		w := want[n]
		if d.Conclusion != w.Conclusion || d.Decided != w.Decided || !slices.Equal(d.Flagged, w.Flagged) || d.Gained != w.Gained || d.Lost != w.Lost {
			t.Errorf("%+v, want %+v", d, w)
		}
	}
	// For: the corrected value gained. Against: the wrong one lost, the genuine one gained.
	if pro, con := Balance(got); pro != 1 || con != 2 {
		t.Errorf("%d for, %d against, want 1 and 2", pro, con)
	}
}
