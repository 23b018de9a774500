package rules

import (
	"fmt"
	"strings"
	"testing"
	"time"
)

// The moments are reckoned by hand from the calendar of March 2026: the 13th is a Friday, and summer time begins in Berlin on the 29th.
func TestSteps(t *testing.T) {
	berlin, err := time.LoadLocation("Europe/Berlin")
	if err != nil {
		t.Fatal(err)
	}
	at := func(text string) time.Time {
		v, err := time.ParseInLocation("2006-01-02 15:04", text, berlin)
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	friday, _ := DateOf(2026, 3, 13)
	full := Group{Reply: 2 * time.Hour, Release: &Due{Minutes: 11 * 60, Days: 1}}
	for _, c := range []struct {
		name        string
		g           Group
		asked, read string
		want        string
	}{
		{"in the evening, read in the morning", full, "2026-03-13 20:10", "2026-03-14 07:00",
			"not answered 03-14 09:00, before hold 03-16 10:30, held 03-16 11:00, still open 03-20 20:10, still open 03-27 20:10"},
		{"between warning and release", full, "2026-03-16 10:40", "2026-03-16 10:40",
			"not answered 03-16 12:40, held 03-16 11:00, still open 03-23 10:40, still open 03-30 10:40"},
		{"after the release", full, "2026-03-16 11:00", "2026-03-16 11:00",
			"not answered 03-16 13:00, still open 03-23 11:00, still open 03-30 11:00"},
		{"no group", Group{}, "2026-03-14 09:00", "2026-03-14 09:00", "still open 03-20 09:00, still open 03-27 09:00"},
		{"a zone of the release", Group{Release: &Due{Minutes: 11 * 60, Timezone: "UTC"}}, "2026-03-13 08:00", "2026-03-13 08:00",
			"before hold 03-13 11:30, held 03-13 12:00, still open 03-20 08:00, still open 03-27 08:00"},
	} {
		f := Flag{Date: friday}
		var words []string
		for _, s := range f.Steps(&c.g, at(c.asked), at(c.read), nil, berlin) {
			words = append(words, fmt.Sprint(s.Stage, s.At.In(berlin).Format(" 01-02 15:04")))
		}
		if got := strings.Join(words, ", "); got != c.want {
			t.Errorf("%s:\n got %s\nwant %s", c.name, got, c.want)
		}
	}
}

// Who is passed on: a reply is missed by what nobody acknowledged, a release by what still asks.
func TestStepFits(t *testing.T) {
	day, _ := DateOf(2026, 3, 16)
	second := &Act{Deed: Decide, Second: true}
	for _, c := range []struct {
		f           Flag
		reply, hold bool
	}{
		{Flag{Standing: Open}, true, true},
		{Flag{Standing: Reopened}, true, true},
		{Flag{Standing: Acknowledged}, false, true},
		{Flag{Standing: Decided, Decided: &Act{Deed: Decide}}, false, false},
		{Flag{Standing: Decided, Decided: second, Last: second}, false, true},
		{Flag{Standing: Waived, Last: &Act{Deed: Waive, Until: day}}, false, false},
		{Flag{Standing: Waived, Last: &Act{Deed: Waive, Until: day - 1}}, true, true},
		{Flag{Standing: SignedOff}, false, false},
		{Flag{Standing: OfHistory}, false, false},
	} {
		if got := (Step{Stage: NotAnswered}).Fits(&c.f, day); got != c.reply {
			t.Errorf("%s: reply %v", c.f.Standing, got)
		}
		for _, s := range []Stage{BeforeHold, Held, StillOpen} {
			if got := (Step{Stage: s}).Fits(&c.f, day); got != c.hold {
				t.Errorf("%s: %s %v", c.f.Standing, s, got)
			}
		}
	}
}
