package watcher_test

import (
	"math/rand/v2"
	"slices"
	"testing"

	"strayd/rules"
	"strayd/watcher"
)

// A chart shows what History lists, and the reference's own returns.
func TestChartShowsTheHistory(t *testing.T) {
	s := &shelf{randomFiles(rand.New(rand.NewPCG(3, 5)), 6, 80, true)}
	settings := rules.Settings{Ranges: []rules.Range{{Name: "hard", Limit: &rules.Limit{Low: -rules.One / 4, High: rules.One / 4}}, ranged("own", nil)}}
	settings.Register([]rules.Series{{ID: "group1-00001", Reference: "group2-00002", Start: rules.NoDate, End: rules.NoDate}})
	d := passed(t, s, settings, 2)
	for _, name := range []string{"group1-00001", "group0-00003"} {
		all, err := d.reader.History(name, rules.NoDate, rules.NoDate)
		if err != nil {
			t.Fatal(err)
		}
		others, _ := d.reader.History("group2-00002", rules.NoDate, rules.NoDate)
		rows := slices.DeleteFunc(slices.Clone(all), func(r watcher.Row) bool { return r.Range != "own" })
		marked := rows[len(rows)-8].Date
		c, err := d.reader.Chart(watcher.ChartOf{Series: name, Marked: marked, To: rows[len(rows)-5].Date, Points: 20})
		if err != nil {
			t.Fatal(err)
		}
		if c.Series != name || c.Range != "own" || c.Marked != marked || len(c.Points) != 20 {
			t.Fatalf("%s: %+v", name, c)
		}
		for i, p := range c.Points {
			row := rows[len(rows)-24+i]
			if p.Date != row.Date || p.Return != row.Return.Float() || p.Finding != row.Finding || p.Lines != row.Lines {
				t.Errorf("%s on %s: %+v, the history says %+v", name, row.Date, p, row)
			}
			want := rules.Num{}
			if n := slices.IndexFunc(others, func(o watcher.Row) bool { return o.Date == row.Date }); n >= 0 && name == "group1-00001" {
				want = rules.Some(others[n].Return.Float())
			}
			if p.Reference != want {
				t.Errorf("%s on %s: reference %v, want %v", name, row.Date, p.Reference, want)
			}
		}
	}
	if _, err := d.reader.Chart(watcher.ChartOf{Series: "nobody"}); err == nil {
		t.Error("a chart of an unknown series")
	}
	if _, err := d.reader.Chart(watcher.ChartOf{Series: "group1-00001", To: 1}); err == nil {
		t.Error("a chart of no date")
	}
}
