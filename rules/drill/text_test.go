package drill

import (
	"strings"
	"testing"

	"strayd/rules"
)

func TestInPercent(t *testing.T) {
	for _, c := range []struct {
		tick rules.Units
		u    rules.Units
		want string
	}{
		{1e11, 125e11, "1.25"}, {1e11, -5e11, "-0.05"}, {1e11, 0, "0.00"}, {1e11, 120e13, "120.00"},
		{1e9, 12345e9, "1.2345"}, {1e9, -1e9, "-0.0001"}, {1e9, 5e13, "5.0000"}, {1, 1, "0.0000000000001"},
	} {
		s := Series{Tick: c.tick}
		if got := s.InPercent(c.u); got != c.want {
			t.Errorf("%d at tick %d: %s, want %s", c.u, c.tick, got, c.want)
		}
	}
}

func TestTickOf(t *testing.T) {
	for _, c := range []struct {
		values []rules.Units
		want   rules.Units
	}{
		{[]rules.Units{5e13, rules.Missing, 25e11}, 1e11},
		{[]rules.Units{5e13}, 1e11}, {[]rules.Units{12345e9, 2e13}, 1e9}, {[]rules.Units{1, 1e11}, 1}, {nil, 1e11},
	} {
		if got := TickOf(c.values); got != c.want {
			t.Errorf("%v: %d, want %d", c.values, got, c.want)
		}
	}
}

func TestFileTexts(t *testing.T) {
	b := oneFund([]int64{10, -25, 0})
	b.Series[0].Feed = "f"
	if text, rows := b.Text("f", 1, 3); text != "date,series,return\n1970-01-02,a,-0.25\n1970-01-03,a,0.00\n" || rows != 2 {
		t.Errorf("%q, %d rows", text, rows)
	}
	if got := b.Broken("f", 1, 0.5, true); got != "date,series,return\n1970-01-02,a,-0." {
		t.Errorf("torn: %q", got)
	}
	if got := b.Broken("f", 1, 0.5, false); !strings.HasSuffix(got, "-0.25\n") {
		t.Errorf("whole: %q", got)
	}
}
