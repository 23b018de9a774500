package rules_test

import (
	"errors"
	"path"
	"testing"

	"strayd/rules"
)

// What the window takes of a flagged value (DESIGN.md, section 4, step 10).
func TestUsedValue(t *testing.T) {
	lines := func(low, high rules.Num) *rules.Verdict {
		return &rules.Verdict{Lines: rules.Lines{Low: low, High: high}}
	}
	some, none := rules.Some, rules.Num{}
	both := lines(some(-0.02), some(0.03))
	limits := []rules.Limit{{Low: -bp(1000), High: bp(500)}, {Low: -bp(100), High: bp(800)}}
	for _, c := range []struct {
		what    string
		pending rules.Pending
		x       rules.Units
		v       *rules.Verdict
		limits  []rules.Limit
		want    rules.Units
	}{
		{"clip above", rules.Clip, bp(5000), both, nil, bp(300)},
		{"clip below", rules.Clip, -bp(5000), both, nil, -bp(200)},
		{"clip inside", rules.Clip, bp(100), both, nil, bp(100)},
		{"clip to its own line before any limit", rules.Clip, bp(5000), both, limits, bp(300)},
		{"clip one-sided, the side looked at", rules.Clip, -bp(5000), lines(some(-0.02), none), nil, -bp(200)},
		{"clip one-sided, the other side", rules.Clip, bp(5000), lines(some(-0.02), none), nil, bp(5000)},
		{"clip rounds a high line down", rules.Clip, bp(5000), lines(none, some(0.0000000000000019)), nil, 1},
		{"clip rounds a low line up", rules.Clip, -bp(5000), lines(some(-0.0000000000000019), none), nil, -1},
		{"clip to the nearest limits", rules.Clip, bp(5000), lines(none, none), limits, bp(500)},
		{"clip to the nearest lower limit", rules.Clip, -bp(5000), lines(none, none), limits, -bp(100)},
		{"without a line or a limit", rules.Clip, bp(5000), lines(none, none), nil, rules.Missing},
		{"keep", rules.Keep, bp(5000), both, limits, bp(5000)},
		{"leave out", rules.LeaveOut, bp(5000), both, limits, rules.Missing},
		{"leave out an inside value that is flagged", rules.LeaveOut, bp(1), both, nil, rules.Missing},
		{"at the largest", rules.Keep, rules.WindowLimit, both, nil, rules.WindowLimit},
		{"beyond the largest", rules.Keep, rules.WindowLimit + 1, both, nil, rules.Missing},
		{"beyond the largest, clip", rules.Clip, -rules.WindowLimit - 1, both, limits, rules.Missing},
		{"a line beyond the largest is held to it", rules.Clip, rules.WindowLimit, lines(none, some(150)), nil, rules.WindowLimit},
	} {
		got, ok := rules.UsedValue(c.pending, c.x, c.v, c.limits)
		if got != c.want || ok != (c.want != rules.Missing) {
			t.Errorf("%s: %s, %v, want %s", c.what, got, ok, c.want)
		}
	}
	if rules.InWindow(rules.WindowLimit+1) || !rules.InWindow(-rules.WindowLimit) || rules.InWindow(rules.Missing) {
		t.Error("the window takes from -100 to 100")
	}
}

// Patterns are ids or globs as path.Match has them: * stops at a slash.
func TestPatterns(t *testing.T) {
	for _, c := range []struct{ pattern, fits, misses string }{
		{"alder", "alder", "alder-2"},
		{"alder-*", "alder-", "alder"},
		{"alder-*", "alder-income", "alder-a/b"},
		{"*", "anything", "a/b"},
		{"a*b", "ab", "abc"},
		{"a?c", "abc", "ac"},
		{"a?c", "aüc", "a/c"},
		{"[ab]x", "bx", "cx"},
		{"[^ab]x", "cx", "ax"},
		{"*/x", "a/x", "a/b/x"},
		{"desk/*", "desk/one", "desk/one/two"},
		{`a\*`, "a*", "ab"},
		{"**", "ab", "a/b"},
		{"", "", "x"},
	} {
		p, err := rules.NewPattern(c.pattern)
		if err != nil {
			t.Fatalf("%q: %v", c.pattern, err)
		}
		if !p.Match(c.fits) || p.Match(c.misses) {
			t.Errorf("%q: %q %v, %q %v", c.pattern, c.fits, p.Match(c.fits), c.misses, p.Match(c.misses))
		}
	}
	for _, bad := range []string{"[", "[a", "a[]", `a\`, "[a-]"} {
		if _, err := rules.NewPattern(bad); !errors.Is(err, path.ErrBadPattern) {
			t.Errorf("%q: %v", bad, err)
		}
	}
}

// Whatever a pattern, it says what path.Match says.
func FuzzPattern(f *testing.F) {
	for _, s := range []string{"a*", "*", "a?", "[a-c]*", `\*`, "a/*", "*a*"} {
		f.Add(s, "abc")
		f.Add(s, "a/b")
	}
	f.Fuzz(func(t *testing.T, pattern, id string) {
		p, err := rules.NewPattern(pattern)
		want, wantErr := path.Match(pattern, id)
		if err != nil {
			if wantErr == nil && want {
				t.Fatalf("%q is refused, and path.Match takes %q by it", pattern, id)
			}
			return
		}
		if got := p.Match(id); got != want {
			t.Fatalf("%q takes %q: %v, path.Match says %v", pattern, id, got, want)
		}
	})
}

// Who belongs where: the register's group first, then the first group whose patterns fit; a range is for groups, ids or globs.
func TestMembership(t *testing.T) {
	m, err := rules.NewMembership(&rules.Settings{
		Groups:   []rules.Group{{Name: "equity", Series: []string{"alder-*", "birch"}}, {Name: "bond", Series: []string{"*-income"}}, {Name: "empty"}},
		Assigned: map[string]string{"alder-growth": "special", "cedar": "bond"},
		Ranges: []rules.Range{{Name: "all"}, {Name: "equity", For: []string{"equity"}}, {Name: "mixed", For: []string{"special", "cash-*", "cedar"}},
			{Name: "named like a group", For: []string{"bond"}}},
	})
	if err != nil {
		t.Fatal(err)
	}
	for id, want := range map[string]struct {
		group string
		by    [4]bool
	}{
		"alder-income": {"equity", [4]bool{true, true, false, false}}, // the first group that fits
		"alder-growth": {"special", [4]bool{true, false, true, false}},
		"alder-nobody": {"equity", [4]bool{true, true, false, false}}, // the register names no group
		"birch":        {"equity", [4]bool{true, true, false, false}},
		"birch-income": {"bond", [4]bool{true, false, false, true}},
		"cedar":        {"bond", [4]bool{true, false, true, true}},
		"cash-one":     {"", [4]bool{true, false, true, false}},
		"bond":         {"", [4]bool{true, false, false, false}}, // a group's name, not an id
		"":             {"", [4]bool{true, false, false, false}},
	} {
		group := m.Group(id)
		if group != want.group {
			t.Errorf("%q is in %q, want %q", id, group, want.group)
		}
		for n, applies := range want.by {
			if m.Applies(n, id, group) != applies {
				t.Errorf("range %d judges %q: %v", n, id, !applies)
			}
		}
	}
	if m.Universal() || m.Groupless() {
		t.Error("there are groups")
	}
	plain, _ := rules.NewMembership(&rules.Settings{Ranges: []rules.Range{{Name: "all"}}})
	if !plain.Universal() || !plain.Groupless() {
		t.Error("one range for all and no group is universal")
	}
	one, _ := rules.NewMembership(&rules.Settings{Ranges: []rules.Range{{Name: "some", For: []string{"x"}}}})
	if one.Universal() || !one.Groupless() {
		t.Error("a range for one series is not universal")
	}
	for _, bad := range []rules.Settings{{Groups: []rules.Group{{Series: []string{"["}}}}, {Ranges: []rules.Range{{For: []string{"["}}}}} {
		if _, err := rules.NewMembership(&bad); !errors.Is(err, path.ErrBadPattern) {
			t.Errorf("%+v: %v", bad, err)
		}
	}
}
