package drill

import (
	"testing"

	"strayd/rules"
)

// scene is a book of three funds and a benchmark over twenty days, and a plant in it.
func scene(p Plant) (*Book, *Plan) {
	b := &Book{}
	for i, id := range []string{"a", "b", "c", "index"} {
		s := Series{ID: id, Group: "g", Feed: "funds", Reference: 3, FX: -1, Tick: hundredth}
		if i == 3 {
			s = Series{ID: id, Feed: "indices", Reference: -1, FX: -1, Helper: true, Tick: hundredth}
		}
		b.Series = append(b.Series, s)
	}
	for t := range 20 {
		b.Dates = append(b.Dates, rules.Date(100+t))
		b.Values = append(b.Values, make([]rules.Units, 4))
	}
	p.Days = natureOf(p.Kind).days
	return b, &Plan{Plants: []Plant{p}}
}

// Each line: a plant on the day with index 5 (date 105), the flags, and what a reader of the table would say by hand.
func TestOutcomesByHand(t *testing.T) {
	row := func(k Kind) Plant { return Plant{Kind: k, Series: 0, Partner: -1, Feed: "funds", At: 5} }
	file := func(k Kind) Plant { return Plant{Kind: k, Series: -1, Partner: -1, Feed: "funds", At: 5} }
	flag := func(series string, date, raised rules.Date, kind rules.Kind, cause rules.Cause) Flag {
		f := Flag{Series: series, Date: date, Raised: raised, Kind: kind, LooksLike: cause, Feed: "funds"}
		return f
	}
	for name, c := range map[string]struct {
		plant          Plant
		flags          []Flag
		same, five     bool
		naming         Naming
		count, follows int
	}{
		"no flag":              {plant: row(X100)},
		"same day, right":      {row(X100), []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseX100)}, true, true, Right, 1, 0},
		"same day, wrong":      {row(X100), []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseX10)}, true, true, Wrong, 1, 0},
		"same day, no cause":   {row(X100), []Flag{flag("a", 105, 105, rules.KindBreach, "")}, true, true, Unnamed, 1, 0},
		"raised a day later":   {row(Div100), []Flag{flag("a", 105, 106, rules.KindStale, rules.CauseDiv100)}, false, true, Right, 1, 0},
		"a later date":         {row(X10), []Flag{flag("a", 109, 109, rules.KindBreach, rules.CauseX10)}, false, true, Unnamed, 1, 0},
		"too late":             {plant: row(X10), flags: []Flag{flag("a", 110, 110, rules.KindBreach, rules.CauseX10)}},
		"raised too late":      {row(X10), []Flag{flag("a", 105, 110, rules.KindBreach, rules.CauseX10)}, false, false, Unnamed, 1, 0},
		"too early":            {plant: row(X10), flags: []Flag{flag("a", 104, 104, rules.KindBreach, rules.CauseX10)}},
		"another series":       {plant: row(X10), flags: []Flag{flag("b", 105, 105, rules.KindBreach, rules.CauseX10)}},
		"weekly kinds":         {plant: row(X10), flags: []Flag{flag("a", 105, 105, rules.KindDrift, "")}},
		"a refused other file": {plant: row(X10), flags: []Flag{flag("", 105, 105, rules.KindRefused, rules.CauseX100)}},
		"two flags, last says": {row(Sign), []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseX10),
			flag("a", 105, 106, rules.KindDoubtful, rules.CauseSign)}, true, true, Right, 2, 0},
		"spike, second day": {row(Spike), []Flag{flag("a", 106, 106, rules.KindBreach, rules.CauseSpike)}, true, true, Right, 1, 0},
		"spike, third day":  {row(Spike), []Flag{flag("a", 107, 107, rules.KindBreach, rules.CauseSpike)}, false, true, Unnamed, 1, 0},
		"partner named": {Plant{Kind: Swapped, Series: 0, Partner: 1, Feed: "funds", At: 5},
			[]Flag{flag("b", 107, 107, rules.KindDoubtful, rules.CauseSwapped)}, false, true, Right, 1, 0},
		"first of a cumulative run is right": {plant: row(Cumulative), flags: []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseX10)}},
		"true move, genuine":                 {row(Move), []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseGenuine)}, true, true, Right, 1, 0},
		"true move, no cause":                {row(Move), []Flag{flag("a", 105, 105, rules.KindBreach, "")}, true, true, Right, 1, 0},
		"true move, called an error":         {row(Move), []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseSplit)}, true, true, Wrong, 1, 0},
		"after an x100: the x100's own flag": {plant: row(MoveAfter), flags: []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseX100)}},
		"after an x100: the move's":          {row(MoveAfter), []Flag{flag("a", 115, 115, rules.KindBreach, "")}, true, true, Right, 1, 0},
		"file refused":                       {file(X100File), []Flag{flag("", 105, 105, rules.KindRefused, rules.CauseX100)}, true, true, Right, 1, 0},
		"file taken, rows flagged": {file(X100File), []Flag{flag("a", 105, 105, rules.KindBreach, rules.CauseX100),
			flag("b", 105, 105, rules.KindBreach, rules.CauseX100)}, true, true, Right, 2, 0},
		"file refused, and what was sent again": {file(X100File), []Flag{flag("", 105, 105, rules.KindRefused, rules.CauseX100),
			flag("b", 105, 105, rules.KindDoubtful, rules.CauseZero)}, true, true, Right, 1, 0},
		"no file, late":      {file(MissingFile), []Flag{flag("", 105, 105, rules.KindLate, "")}, true, true, Unnamed, 1, 0},
		"no file, only rows": {plant: file(MissingFile), flags: []Flag{flag("a", 105, 105, rules.KindBreach, "")}},
		"wrong benchmark, and a fund": {Plant{Kind: ReferenceBad, Series: 3, Partner: -1, Feed: "indices", At: 5},
			[]Flag{flag("index", 105, 105, rules.KindDoubtful, rules.CauseReference), flag("c", 105, 105, rules.KindDoubtful, rules.CauseSign)},
			true, true, Right, 1, 1},
	} {
		b, p := scene(c.plant)
		o := Outcomes(b, p, c.flags)[0]
		if o.SameDay() != c.same || o.FiveDays() != c.five || o.Naming != c.naming || o.Flags != c.count || o.Followed != c.follows {
			t.Errorf("%s: same day %v, five days %v, naming %d, %d flags, %d on followers; want %v %v %d %d %d", name, o.SameDay(), o.FiveDays(), o.Naming,
				o.Flags, o.Followed, c.same, c.five, c.naming, c.count, c.follows)
		}
	}
}

// 3 funds x 20 days = 60 values; a spike on days 5 and 6 and the five days after take 7 of one fund away: 53.
func TestUntouchedByHand(t *testing.T) {
	b, p := scene(Plant{Kind: Spike, Series: 0, Partner: -1, Feed: "funds", At: 5})
	flags := []Flag{
		{Series: "a", Date: 104, Kind: rules.KindBreach, Range: "own"},      // false
		{Series: "a", Date: 105, Kind: rules.KindBreach, Range: "own"},      // planted
		{Series: "a", Date: 111, Kind: rules.KindBreach, Range: "own"},      // in its shadow
		{Series: "a", Date: 112, Kind: rules.KindBreach, Range: "own"},      // false
		{Series: "b", Date: 105, Kind: rules.KindBreach, Range: "residual"}, // another line
		{Series: "b", Date: 105, Kind: rules.KindStale},                     // false, doubtful
		{Series: "index", Date: 112, Kind: rules.KindBreach, Range: "own"},  // a helper
	}
	got := Untouched(b, p, flags, []Promise{{Name: "own", Kinds: []rules.Kind{rules.KindBreach}, Range: "own", Share: 0.1},
		{Name: "doubtful", Kinds: []rules.Kind{rules.KindDoubtful, rules.KindStale, rules.KindRepeat}, Share: 0.01}})
	want := []Quiet{{"own", 53, 2, 5.3}, {"doubtful", 53, 1, 0.53}}
	for i := range want {
		if d := got[i].Promised - want[i].Promised; got[i].Name != want[i].Name || got[i].Values != 53 || got[i].Flags != want[i].Flags || d*d > 1e-20 {
			t.Errorf("%+v, want %+v", got[i], want[i])
		}
	}
}

func TestRefusedUntouchedByHand(t *testing.T) {
	b, p := scene(Plant{Kind: LateFile, Series: -1, Partner: -1, Feed: "funds", At: 5})
	flags := []Flag{{Feed: "funds", Date: 103, Kind: rules.KindRefused},
		{Feed: "funds", Date: 105, Kind: rules.KindRefused},
		{Feed: "funds", Date: 109, Kind: rules.KindLate}}
	if refused, files := RefusedUntouched(b, p, flags); refused != 1 || files != 18 { // 20 days less the planted one and the next
		t.Errorf("%d of %d, want 1 of 18", refused, files)
	}
}

// Rows count what their names say.
func TestRowsByHand(t *testing.T) {
	b, p := scene(Plant{Kind: X100, Series: 0, Partner: -1, Feed: "funds", At: 5})
	p.Plants = append(p.Plants, Plant{Kind: X100, Series: 1, Partner: -1, At: 5, Days: 1}, Plant{Kind: X100, Series: 2, Partner: -1, At: 5, Days: 1},
		Plant{Kind: Move, Series: 2, Partner: -1, At: 15, Days: 1})
	all := Outcomes(b, p, []Flag{{Series: "a", Date: 105, Kind: rules.KindBreach, LooksLike: rules.CauseX100},
		{Series: "b", Date: 107, Kind: rules.KindBreach}})
	rows := ByKind(all)
	want := []Row{{Name: "x100", Planted: 3, SameDay: 1, FiveDays: 2, Right: 1, Not: 1, Single: 2, Flags: 2}, {Name: "move", Planted: 1}}
	if len(rows) != 2 || rows[0] != want[0] || rows[1] != want[1] {
		t.Errorf("%+v, want %+v", rows, want)
	}
	if by := SplitBy(b, all, (*Series).Basis); len(by) != 1 || by[0].Name != "benchmark" || by[0].Planted != 4 {
		t.Errorf("%+v", by)
	}
	for _, f := range Floors() {
		if r := f.Count(b, all); f.Name == "x100 row" && (r.Planted != 3 || f.CaughtIn(&r) != 1) {
			t.Errorf("%+v", r)
		}
	}
}
