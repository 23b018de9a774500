package rules

import (
	"fmt"
	"math/rand/v2"
	"strings"
	"testing"
	"time"
)

func arrival(t *testing.T) *Arrival {
	zone := place(t, "America/New_York")
	day := date(t, "2026-06-05")
	return &Arrival{Feed: "administrator", Date: day, Due: DueAt(Due{Minutes: 19*60 + 30}, day, zone)}
}

func TestArrival(t *testing.T) {
	names := func(n int) (list []string) {
		for i := range n {
			list = append(list, fmt.Sprintf("s%02d", i))
		}
		return list
	}
	tests := []struct {
		came, others int
		missed       []string
		refused      string
		want         Completeness
		note         string
	}{
		{0, 0, nil, "", Late, "nothing came by 2026-06-05 19:30 -04:00, and no date of this feed is held to say which series to expect"},
		{0, 0, nil, "a.csv", Late, "nothing came by 2026-06-05 19:30 -04:00, and no date of this feed is held to say which series to expect; a.csv was refused"},
		{0, 0, names(2), "", Late, "nothing came by 2026-06-05 19:30 -04:00; expected 2 series: s00, s01"},
		{0, 0, names(10), "", Late, "nothing came by 2026-06-05 19:30 -04:00; expected 10 series: " + strings.Join(names(10), ", ")},
		{0, 0, names(42), "a.csv", Late, "nothing came by 2026-06-05 19:30 -04:00; expected 42 series: " + strings.Join(names(10), ", ") + " and 32 more; a.csv was refused"},
		{39, 0, names(3), "", Partial, "no value of 3 of 42 expected series by 2026-06-05 19:30 -04:00: s00, s01, s02"},
		{0, 5, names(1), "", Partial, "no value of 1 of 1 expected series by 2026-06-05 19:30 -04:00: s00"},
		{0, 5, nil, "", Whole, ""},
		{42, 1, nil, "a.csv", Whole, ""},
	}
	now := time.Date(2026, 6, 5, 23, 31, 0, 0, time.UTC)
	for _, tt := range tests {
		a := arrival(t)
		a.Came, a.Others, a.Refused = tt.came, tt.others, tt.refused
		for _, s := range tt.missed {
			a.Miss(s)
		}
		if got := a.Completeness(); got != tt.want {
			t.Errorf("%+v is %s, want %s", tt, got, tt.want)
		}
		f, ok := a.Flag(now)
		if ok != (tt.want != Whole) || f.Note != tt.note {
			t.Errorf("flag %v\n got %s\nwant %s", ok, f.Note, tt.note)
		}
		want := Flag{RaisedAt: now, Date: a.Date, Kind: KindLate, Return: Missing, Standing: Open, Feed: "administrator", Note: tt.note}
		if ok && f != want {
			t.Errorf("flag %+v, want %+v", f, want)
		}
	}
}

// Whatever the order in which they are found missing, the first ten names are told.
func TestArrivalNamesTheFirst(t *testing.T) {
	const seed = 5
	r := rand.New(rand.NewPCG(seed, 0))
	for range 50 {
		a := arrival(t)
		for _, n := range r.Perm(200) {
			a.Miss(fmt.Sprintf("s%03d", n))
		}
		f, _ := a.Flag(time.Time{})
		if want := ": s000, s001, s002, s003, s004, s005, s006, s007, s008, s009 and 190 more"; !strings.HasSuffix(f.Note, want) {
			t.Fatalf("seed %d: %s", seed, f.Note)
		}
	}
}
