package config

import (
	"strings"
	"testing"
)

const setText = `ledger: ledger.db
feeds:
  - {name: book, files: "*.csv"}
groups:
  - {name: equity, series: ["alder-*"]}
ranges:
  - name: own
    window: 60
  - {name: hard, limit: [-50%, 50%]}
`

// A line that is set says what the same line in the file would say.
func TestSetStandsInPlaceOfALine(t *testing.T) {
	for _, c := range []struct{ set, from, to string }{
		{"ranges.own.window=120", "window: 60", "window: 120"},
		{"ranges.0.window=120", "window: 60", "window: 120"},
		{"ranges.own.breach={tail: 0.5%}", "window: 60", "window: 60\n    breach: {tail: 0.5%}"},
		{" doubtful =0.1%", "groups:", "doubtful: 0.1%\ngroups:"},
		{"ranges.hard.limit=[-20%, 20%]", "[-50%, 50%]", "[-20%, 20%]"},
		{"ranges.hard={name: hard, limit: [-20%, 20%]}", "[-50%, 50%]", "[-20%, 20%]"},
		{"groups=[]", "groups:\n  - {name: equity, series: [\"alder-*\"]}", "groups: []"},
	} {
		opt := testOptions
		opt.Set = []string{c.set}
		got, err := Parse("strayd.yaml", []byte(setText), opt)
		if err != nil {
			t.Errorf("%s: %v", c.set, err)
			continue
		}
		want, err := Parse("strayd.yaml", []byte(strings.Replace(setText, c.from, c.to, 1)), testOptions)
		if err != nil {
			t.Fatal(err)
		}
		one, two := got.Settings(), want.Settings()
		if string(one.Text()) != string(two.Text()) {
			t.Errorf("%s: %s\nwant %s", c.set, one.Text(), two.Text())
		}
	}
}

func TestSetNamesWhatIsWrong(t *testing.T) {
	for set, want := range map[string]string{
		"ranges.own.window":      `not a line to set (got "ranges.own.window"; expected PATH=VALUE`,
		"=3":                     "not a line to set",
		"ranges.mine.window=9":   `no item "mine" to set`,
		"ranges.9.window=9":      `no item "9" to set`,
		"channels.desk.hours=9":  `no key "channels" to set something below`,
		"ledger.path=x":          `nothing lies below the value before "path"`,
		"ranges.own.window=[1":   "the value to set is not YAML",
		"ranges.own.window=":     "the value to set is not YAML",
		"ranges.own.window=many": "strayd.yaml:8:13: ranges[0].window:",
		"ranges.own.widow=9":     "ranges[0].widow: unknown key",
		"ranges.own.window=&a 9": "an anchor",
	} {
		opt := testOptions
		opt.Set = []string{set}
		if _, err := Parse("strayd.yaml", []byte(setText), opt); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v, want %q in it", set, err, want)
		}
	}
}
