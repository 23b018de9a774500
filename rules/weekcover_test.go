package rules

import (
	"encoding/csv"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"strconv"
	"strings"
	"testing"

	"strayd/stats"
)

const grid = "../testdata/reference/grid/"

// gridRows reads a table of outside values by the names of its columns.
func gridRows(t *testing.T, name string) (rows []map[string]float64) {
	t.Helper()
	f, err := os.Open(grid + name)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	lines, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	for _, line := range lines[1:] {
		row := map[string]float64{}
		for i, name := range lines[0] {
			row[name], _ = strconv.ParseFloat(line[i], 64)
		}
		rows = append(rows, row)
	}
	return rows
}

// Kupiec's p-values and Christoffersen's: testdata/reference/grid, 30 digits by mpmath.
func TestCoverageAgainstGrid(t *testing.T) {
	compared := 0
	for _, r := range gridRows(t, "kupiec_pof.csv") {
		got := CoverTally{Judged: int(r["T"]), Beyond: int(r["x"])}.Judge(r["p"], 1)
		if want := max(r["p_value"], stats.SmallestTail); math.Abs(got.Kupiec.V-want) > 1e-12*want*math.Max(1, r["LR"]) {
			t.Errorf("%v of %v at %v: p %v, want %v", r["x"], r["T"], r["p"], got.Kupiec.V, want)
		}
		if math.Abs(got.Expected-r["T"]*r["p"]) > 1e-9 {
			t.Errorf("%v at %v: expected %v", r["T"], r["p"], got.Expected)
		}
		compared++
	}
	for _, r := range gridRows(t, "christoffersen.csv") {
		n := stats.Transitions{N00: int(r["n00"]), N01: int(r["n01"]), N10: int(r["n10"]), N11: int(r["n11"])}
		got := CoverTally{Judged: n.N00 + n.N01 + n.N10 + n.N11 + 1, Beyond: n.N01 + n.N11, Transitions: n}.Judge(r["p"], 1)
		if want := r["p_ind"]; got.Apart.OK && math.Abs(got.Apart.V-want) > 1e-11*math.Max(1, r["LR_ind"]) {
			t.Errorf("%+v: p %v, want %v", n, got.Apart.V, want)
		}
		compared++
	}
	if compared < 30 {
		t.Errorf("%d figures compared", compared)
	}
}

func workedExample(t *testing.T, id, part, key string, into any) {
	t.Helper()
	text, err := os.ReadFile("../testdata/reference/worked/worked_examples.json")
	if err != nil {
		t.Fatal(err)
	}
	var list []map[string]json.RawMessage
	if err := json.Unmarshal(text, &list); err != nil {
		t.Fatal(err)
	}
	for _, w := range list {
		if string(w["id"]) != strconv.Quote(id) {
			continue
		}
		var keys map[string]json.RawMessage
		if err := json.Unmarshal(w[part], &keys); err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(keys[key], into); err != nil {
			t.Fatal(err)
		}
		return
	}
	t.Fatalf("no worked example %s", id)
}

// The words agree with Kupiec's regions (1995, table as in Jorion), where the table's sizes are enough to speak.
func TestCoverageWordsAgainstKupiecRegions(t *testing.T) {
	var regions map[string][2]int
	workedExample(t, "kupiec_table", "recomputed", "inclusive_region_by_p,T", &regions)
	said := map[CoverVerdict]int{}
	for key, region := range regions {
		var p float64
		var n int
		if _, err := fmt.Sscan(strings.ReplaceAll(key, ",", " "), &p, &n); err != nil {
			t.Fatal(err)
		}
		for x := range 2 * region[1] {
			want := Consistent
			switch {
			case x < region[0]:
				want = TooFew
			case x > region[1]:
				want = TooMany
			}
			got := CoverTally{Judged: n, Beyond: x}.Judge(p, 1)
			if got.Verdict != want {
				t.Errorf("%d of %d at %v: %s, want %s", x, n, p, got.Verdict, want)
			}
			said[want]++
		}
	}
	for _, v := range []CoverVerdict{Consistent, TooFew, TooMany} {
		if said[v] < 15 {
			t.Errorf("%s: %d cases", v, said[v])
		}
	}
}

// Too little: fewer than 250 judged whatever the count; and at 0.27 % of 250, where even none has a p above 5 %: by hand
// LR(250, 0.0027, 0) = -500 ln 0.9973 = 1.352, p = 0.245.
func TestTooLittleToSay(t *testing.T) {
	for _, c := range []struct {
		beyond, judged int
		share          float64
		want           CoverVerdict
	}{{0, 0, 0.01, TooLittle}, {5, 20, 0.01, TooLittle}, {249, 249, 0.01, TooLittle}, {0, 250, 0.0027, TooLittle}, {1, 250, 0.0027, TooLittle},
		{5, 250, 0.0027, TooMany}, {0, 250, 0.01, TooFew}, {2, 250, 0.01, Consistent}, {1, 100, 0, TooLittle}} {
		if got := (CoverTally{Judged: c.judged, Beyond: c.beyond}).Judge(c.share, 1); got.Verdict != c.want {
			t.Errorf("%d of %d at %v: %s, want %s", c.beyond, c.judged, c.share, got.Verdict, c.want)
		}
	}
}

// The published zones, and the share of good series that the table itself puts beyond four: 10.8 % (Basle Committee 1996, table 2).
func TestSeriesZones(t *testing.T) {
	for beyond := range 15 {
		c := Cover{Share: CoverShare}
		for n := range 1000 {
			c.Take(fmt.Sprint(n), CoverTally{}, CoverTally{Judged: 250, Beyond: beyond})
		}
		want := Zones{Green: 1000}
		switch {
		case beyond >= 10:
			want = Zones{Red: 1000}
		case beyond >= 5:
			want = Zones{Yellow: 1000}
		}
		if c.Zones != want || (len(c.Notable) == 1000) != (beyond > 4) || (c.None == 1000) != (beyond == 0) {
			t.Errorf("%d beyond: %+v, %d named, %d with none; want %+v", beyond, c.Zones, len(c.Notable), c.None, want)
		}
		var exact float64
		workedExample(t, "basel_traffic_light", "recomputed", "P(X>=5)", &exact)
		many, none := c.Chance()
		var cumulative []float64
		workedExample(t, "basel_traffic_light", "recomputed", "cumulative_pct", &cumulative)
		if math.Abs(many-1000*exact) > 1e-6 || math.Abs(none-10*cumulative[0]) > 1e-6 {
			t.Errorf("by chance %v have more than four and %v none, want %v and %v", many, none, 1000*exact, 10*cumulative[0])
		}
	}
	short := Cover{Share: CoverShare}
	short.Take("new", CoverTally{}, CoverTally{Judged: 249, Beyond: 20})
	if short.Zones.Whole() != 0 || short.Series != 1 || len(short.Notable) != 0 {
		t.Errorf("a series with 249 judged: %+v", short)
	}
}

// Jorion's exercise: six beyond, four of them after another, are in clusters; the same six apart are not.
func TestClusters(t *testing.T) {
	c := CoverTally{252, 6, stats.Transitions{N00: 244, N01: 2, N10: 2, N11: 4}}.Judge(0.01, 1)
	if !c.Cluster || c.Apart.V > 1e-6 {
		t.Errorf("Jorion's six: %+v", c)
	}
	if c := (CoverTally{252, 6, stats.Transitions{N00: 239, N01: 6, N10: 6}}).Judge(0.01, 1); c.Cluster {
		t.Errorf("six apart: %+v", c)
	}
}

// By hand: n = 100 a date with 0 and 4 beyond in turn has share 0.02, and each date (2^2)/(100 x 0.02 x 0.98) = 2.0408.
func TestTogether(t *testing.T) {
	var days []CoverDay
	for n := range 40 {
		days = append(days, CoverDay{Date: Date(n), Judged: 100, Outer: 4 * (n % 2)})
	}
	if got := Together(days, OuterOf); math.Abs(got-4/1.96) > 1e-12 {
		t.Errorf("scatter %v, want %v", got, 4/1.96)
	}
	for _, c := range [][]CoverDay{nil, days[:19], {{Judged: 5, Outer: 5}}} {
		if got := Together(c, OuterOf); got != 1 {
			t.Errorf("%d dates: scatter %v, want 1", len(c), got)
		}
	}
	random := rand.New(rand.NewPCG(7, 7)) // independent series scatter by 1, up to 4 times its own error sqrt(2/2000)
	var apart []CoverDay
	for n := range 2000 {
		d := CoverDay{Date: Date(n), Judged: 400}
		for range d.Judged {
			if random.Float64() < 0.05 {
				d.Inner++
			}
		}
		apart = append(apart, d)
	}
	if got := Together(apart, InnerOf); got > 1.13 {
		t.Errorf("independent series scatter by %v", got)
	}
}

// 500 series over 5 days at 0.27 %: the middle 95 % is 2 to 12 for independent series (PRACTICE, section 6; the binomial's own). What a
// scatter does is our own reading: the count stands for so many fewer independent ones.
func TestBand(t *testing.T) {
	if low, high := Band(2500, 0.0027, 1); low != 2 || high != 12 {
		t.Errorf("band %d to %d, want 2 to 12", low, high)
	}
	low, high := Band(2500, 0.0027, 20)
	if low != 0 || high < 20 || high > 46 {
		t.Errorf("band with a scatter of 20: %d to %d", low, high)
	}
	for _, c := range []struct {
		n     int
		share float64
	}{{0, 0.01}, {10, 0}, {10, 1}} {
		if low, high := Band(c.n, c.share, 3); low != 0 || high != 0 {
			t.Errorf("band of %d at %v: %d to %d", c.n, c.share, low, high)
		}
	}
}

// A pool of groups is what one group of all of them would be.
func TestPool(t *testing.T) {
	a := Cover{Range: "own", Group: "a", Share: 0.01, Days: []CoverDay{{1, 5, 1, 2}, {3, 5, 0, 1}}}
	b := Cover{Range: "own", Group: "b", Share: 0.01, Days: []CoverDay{{1, 3, 0, 1}, {2, 3, 1, 1}}}
	a.Take("x", CoverTally{Judged: 250, Beyond: 1}, CoverTally{Judged: 250, Beyond: 6, Transitions: stats.Transitions{N00: 238, N01: 5, N10: 5, N11: 1}})
	b.Take("y", CoverTally{Judged: 250}, CoverTally{Judged: 250, Beyond: 7, Transitions: stats.Transitions{N00: 236, N01: 6, N10: 6, N11: 1}})
	p := Pool([]Cover{a, b})
	if p.Series != 2 || p.Inner != (CoverTally{500, 13, stats.Transitions{N00: 474, N01: 11, N10: 11, N11: 2}}) || p.Outer.Beyond != 1 || p.Zones.Yellow != 2 {
		t.Errorf("%+v", p)
	}
	if len(p.Days) != 3 || p.Days[0] != (CoverDay{1, 8, 1, 3}) || p.Days[1] != (CoverDay{2, 3, 1, 1}) || p.Notable[0].Series != "y" {
		t.Errorf("%+v, %+v", p.Days, p.Notable)
	}
}
