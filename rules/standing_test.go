package rules_test

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"strayd/rules"
)

var (
	noon = time.Date(2026, 3, 13, 12, 0, 0, 0, time.UTC)
	ada  = rules.Person{UID: 1001, Name: "ada"}
	bea  = rules.Person{UID: 1002, Name: "bea"}
)

func day(t testing.TB, s string) rules.Date {
	t.Helper()
	d, err := rules.ParseDate(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func deed(d rules.Deed, by rules.Person) *rules.Act {
	a := &rules.Act{Deed: d, By: by, At: noon, Value: rules.Missing, Until: rules.NoDate}
	if d == rules.Decide {
		a.Conclusion, a.Reason, a.Note = rules.Genuine, rules.KnownEvent, "said"
	}
	return a
}

// From which standing which deed leads where, as DESIGN.md has the words: what is open or reopened is acknowledged; what asks is waived;
// anything is decided; only what is decided is signed off.
func TestDeedsAndStandings(t *testing.T) {
	leads := map[rules.Deed]map[rules.Standing]rules.Standing{
		rules.Acknowledge: {rules.Open: rules.Acknowledged, rules.Reopened: rules.Acknowledged},
		rules.Waive: {rules.Open: rules.Waived, rules.Reopened: rules.Waived, rules.Acknowledged: rules.Waived,
			rules.Waived: rules.Waived},
		rules.Decide: {rules.Open: rules.Decided, rules.Reopened: rules.Decided, rules.Acknowledged: rules.Decided, rules.Waived: rules.Decided,
			rules.Decided: rules.Decided, rules.SignedOff: rules.Decided, rules.OfHistory: rules.Decided},
		rules.SignOff: {rules.Decided: rules.SignedOff},
		rules.Accept: {rules.Open: rules.Decided, rules.Reopened: rules.Decided, rules.Acknowledged: rules.Decided, rules.Waived: rules.Decided,
			rules.Decided: rules.Decided, rules.OfHistory: rules.Decided},
	}
	today := day(t, "2026-03-13")
	for _, d := range rules.Deeds {
		for _, s := range rules.Standings {
			f := rules.Flag{Ref: 7, Kind: rules.KindBreach, Standing: s}
			if s == rules.Waived {
				f.Last = &rules.Act{Deed: rules.Waive, By: ada, Until: today}
			}
			a := deed(d, ada)
			if d == rules.Waive {
				a.Until = today
			}
			got, err := f.After(a, today)
			want, leadsOn := leads[d][s]
			switch {
			case leadsOn && (err != nil || got.Standing != want || got.Last != a):
				t.Errorf("%s of what is %s: %s, %v, want %s", d, s, got.Standing, err, want)
			case !leadsOn && (err == nil || !strings.Contains(err.Error(), "flag 7 is "+string(s))):
				t.Errorf("%s of what is %s: %v", d, s, err)
			}
			if leadsOn && (got.Decided == a) != (d == rules.Decide || d == rules.Accept) {
				t.Errorf("%s of what is %s: decided is %v", d, s, got.Decided)
			}
		}
	}
}

func TestActsThatDoNotGo(t *testing.T) {
	today := day(t, "2026-03-13")
	decided, err := rules.Flag{Ref: 7, Kind: rules.KindBreach, Standing: rules.Open}.After(deed(rules.Decide, ada), today)
	if err != nil {
		t.Fatal(err)
	}
	sign := func(by rules.Person, second bool) *rules.Act {
		a := deed(rules.SignOff, by)
		a.Second = second
		return a
	}
	over := deed(rules.Waive, ada)
	over.Until = today - 1
	corrected := deed(rules.Decide, ada)
	corrected.Conclusion, corrected.Value = rules.Corrected, 0
	for _, c := range []struct {
		f    rules.Flag
		a    *rules.Act
		want string // "" for none
	}{
		{decided, sign(ada, false), ""},
		{decided, sign(ada, true), "a second person must sign it off"},
		{decided, sign(rules.Person{UID: 1001, Name: "bea"}, true), "a second person must sign it off"}, // the uid counts, not the name
		{decided, sign(bea, true), ""},
		{decided, deed(rules.Decide, bea), "decided so already"},
		{rules.Flag{Kind: rules.KindBreach, Standing: rules.Open}, over, "which is over"},
		{rules.Flag{Kind: rules.KindLate, Standing: rules.Open}, corrected, "no single value that could be corrected"},
		{rules.Flag{Kind: rules.KindRestated, Standing: rules.Open}, corrected, ""},
	} {
		if _, err := c.f.After(c.a, today); (err == nil) != (c.want == "") || err != nil && !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s of %s: %v, want %q", c.a.Deed, c.f.Kind, err, c.want)
		}
	}
}

// A waiver holds up to and including its date; a decision that waits for a second person asks for one.
func TestWhatAsks(t *testing.T) {
	until := day(t, "2026-03-20")
	waived := rules.Flag{Standing: rules.Waived, Last: &rules.Act{Deed: rules.Waive, Until: until}}
	for _, c := range []struct {
		on   rules.Date
		want rules.Standing
	}{{until - 1, rules.Waived}, {until, rules.Waived}, {until + 1, rules.Reopened}} {
		if got := waived.StandingOn(c.on); got != c.want || waived.AsksOn(c.on) != (c.want == rules.Reopened) || !waived.Unfinished() {
			t.Errorf("on %s it is %s, want %s", c.on, got, c.want)
		}
	}
	for _, s := range rules.Standings {
		if s == rules.Waived {
			continue
		}
		f := rules.Flag{Standing: s, Decided: &rules.Act{Deed: rules.Decide, Second: true}}
		asks := s == rules.Open || s == rules.Acknowledged || s == rules.Reopened || s == rules.Decided
		if f.AsksOn(until) != asks || f.Unfinished() != asks {
			t.Errorf("%s, with four eyes: asks %v, unfinished %v", s, f.AsksOn(until), f.Unfinished())
		}
		f.Decided.Second = false
		if asks = asks && s != rules.Decided; f.AsksOn(until) != asks || f.Unfinished() != asks {
			t.Errorf("%s: asks %v, unfinished %v", s, f.AsksOn(until), f.Unfinished())
		}
	}
}

// What windows take by a decision.
func TestUses(t *testing.T) {
	for _, c := range []struct {
		conclusion rules.Conclusion
		value, x   rules.Units
		want       rules.Units
	}{
		{rules.Genuine, rules.Missing, 5, 5}, {rules.Erroneous, rules.Missing, 5, rules.Missing}, {rules.Corrected, -7, 5, -7},
		{rules.Corrected, 0, 5, 0}, {rules.Genuine, rules.Missing, rules.WindowLimit + 1, rules.Missing},
		{rules.Corrected, rules.WindowLimit, rules.WindowLimit + 1, rules.WindowLimit},
	} {
		a := rules.Act{Conclusion: c.conclusion, Value: c.value}
		if got := a.Uses(c.x); got != c.want {
			t.Errorf("%s %s of %s: %s, want %s", c.conclusion, c.value, c.x, got, c.want)
		}
	}
}

func drawAct(t *rapid.T) rules.Act {
	text := rapid.StringOfN(rapid.RuneFrom([]rune("aü\"\\\n\u202e;, ")), 0, 20, -1)
	a := rules.Act{Deed: rapid.SampledFrom(rules.Deeds).Draw(t, "deed"), Step: rapid.Uint32().Draw(t, "step"),
		By:   rules.Person{UID: rapid.IntRange(0, 1<<31).Draw(t, "uid"), Name: rapid.SampledFrom([]string{"", "ada"}).Draw(t, "name")},
		Note: text.Draw(t, "note"), Override: text.Draw(t, "override"), Value: rules.Missing, Until: rules.NoDate}
	if a.Deed == rules.Decide {
		a.Conclusion = rapid.SampledFrom(rules.Conclusions).Draw(t, "conclusion")
		a.Reason = rapid.SampledFrom(rules.Reasons).Draw(t, "reason")
	}
	if a.Conclusion == rules.Corrected {
		a.Value = rules.Units(rapid.Int64Range(-int64(rules.WindowLimit), int64(rules.WindowLimit)).Draw(t, "value"))
	}
	if a.Deed == rules.Waive {
		a.Until = rules.Date(rapid.IntRange(-10000, 40000).Draw(t, "until"))
	}
	return a
}

// An entry reads back as it was written, and gives the act of each of its flags.
func TestEntryReadsBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		e := rules.Entry{Act: drawAct(t), Refs: []uint64{3, 8}, Second: []uint64{8}, Feed: "desk", File: "a.csv", SHA256: "00", More: 2,
			Differ: []rules.Differs{{Series: "x\u2028", Date: 20000, Range: "own", Issued: rules.Breach, Now: rules.Inside}}}
		got, err := rules.ParseEntry(e.Text())
		if err != nil || fmt.Sprintf("%+v", *got) != fmt.Sprintf("%+v", e) {
			t.Fatalf("%s\nreads back as %+v, %v, want %+v", e.Text(), got, err, e)
		}
		for ref, want := range map[uint64][2]bool{3: {true, false}, 8: {true, true}, 9: {false, false}} {
			a, ok := got.Of(ref)
			if ok != want[0] || a.Second != want[1] || a.Note != e.Note {
				t.Fatalf("of %d: %+v, %v", ref, a, ok)
			}
		}
	})
	for _, bad := range []string{"", "{}", `{"act":"sell"}`, `{"act":"decide","value":"x"}`, `{"act":"waive","until":"soon"}`,
		`{"act":"decide","differ":[{"date":"x"}]}`} {
		if e, err := rules.ParseEntry([]byte(bad)); err == nil {
			t.Errorf("%s reads as %+v", bad, e)
		}
	}
}

func TestParseReason(t *testing.T) {
	for text, want := range map[string]rules.Reason{"market move": rules.MarketMove, " Market-Move ": rules.MarketMove, "unexplained": rules.Unexplained} {
		if got, err := rules.ParseReason(text); got != want || err != nil {
			t.Errorf("%q: %q, %v", text, got, err)
		}
	}
	for _, bad := range []string{"", "weather", "market"} {
		if _, err := rules.ParseReason(bad); err == nil || !strings.Contains(err.Error(), "need one of market move, portfolio event") {
			t.Errorf("%q: %v", bad, err)
		}
	}
	if got := (rules.Person{UID: 5}).String() + ", " + ada.String(); got != "uid 5, ada (uid 1001)" {
		t.Error(got)
	}
}
