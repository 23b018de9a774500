package config

import (
	"encoding/json"
	"slices"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

// each calls visit for every key of the table with its path, lists as "[]".
func each(o object, path string, visit func(path string, f field)) {
	for _, f := range o.fields {
		p := join(path, f.key)
		visit(p, f)
		inner := p
		if _, ok := f.shape.(interface{ element() shape }); ok {
			inner += "[]"
		}
		if next, ok := inside(f.shape); ok {
			each(next, inner, visit)
		}
	}
}

// The keys of DESIGN.md, section 7, written out by hand: the table has these and no others.
const designKeys = `ledger timezone calendar feeds feeds[].name feeds[].files feeds[].schedule feeds[].due feeds[].due.at feeds[].due.days
feeds[].due.timezone feeds[].layout feeds[].columns feeds[].columns.date feeds[].columns.series feeds[].columns.value
feeds[].columns.status feeds[].columns.days feeds[].value feeds[].unit feeds[].date feeds[].decimal feeds[].separator feeds[].sheet
feeds[].encoding feeds[].missing feeds[].settle feeds[].sentinel feeds[].bad_rows feeds[].bad_rows.skip series events groups
groups[].name groups[].series groups[].reference groups[].owner groups[].reply groups[].release groups[].release.at
groups[].release.days groups[].release.timezone groups[].four_eyes groups[].materiality ranges ranges[].name ranges[].of ranges[].for ranges[].window
ranges[].scale ranges[].decay ranges[].tail ranges[].tail.t ranges[].predictive ranges[].side ranges[].watch ranges[].watch.tail
ranges[].watch.confidence ranges[].watch.z ranges[].watch.budget ranges[].breach ranges[].breach.tail ranges[].breach.confidence
ranges[].breach.z ranges[].breach.budget ranges[].pending ranges[].limit doubtful channels channels[].name channels[].slack
channels[].slack.channel channels[].webhook channels[].webhook.url channels[].mail channels[].mail.to channels[].mail.from
channels[].mail.server channels[].mail.tls channels[].console channels[].for channels[].kinds channels[].hours channels[].form
channels[].fallback channels[].fallback_after weekly weekly.schedule weekly.channels`

// furtherKeys came later, each with the key that it stands after.
var furtherKeys = [][2]string{{"root", "doubtful"}, {"groups[].escalate", "groups[].release.timezone"}, {"page", "weekly.channels"},
	{"page.listen", "page"}, {"page.host", "page.listen"}, {"page.identity", "page.host"}}

func TestTableHasTheKeysOfTheDesign(t *testing.T) {
	var got []string
	each(table, "", func(path string, f field) {
		got = append(got, path)
		if len(f.doc) < 10 || !strings.HasSuffix(f.doc, ".") {
			t.Errorf("%s: doc %q says nothing", path, f.doc)
		}
		if f.shape.want() == "" {
			t.Errorf("%s does not say what it expects", path)
		}
	})
	want := strings.Fields(designKeys)
	for _, key := range furtherKeys {
		want = slices.Insert(want, slices.Index(want, key[1])+1, key[0])
	}
	if strings.Join(got, " ") != strings.Join(want, " ") {
		t.Errorf("keys\n got %s\nwant %s", got, want)
	}
}

// Every default is a value that its own key would take.
func TestDefaultsAreValid(t *testing.T) {
	c := minimal(t, "")
	dst := map[string]any{"feeds[]": &c.Feeds[0], "feeds[].columns": &c.Feeds[0].Columns, "groups[]": &rules.Group{}, "ranges[]": &c.Ranges[0],
		"channels[]": &c.Channels[0], "channels[].mail": &rules.Mail{}, "weekly": &Weekly{}, "": c, "feeds[].due": &rules.Due{}, "groups[].release": &rules.Due{}}
	n := 0
	each(table, "", func(path string, f field) {
		if f.initial == "" {
			return
		}
		n++
		d := newDecoder(testOptions.filled(), "/desk")
		f.shape.read(d, path, f.start(), f.at(dst[parent(path)]))
		if len(d.faults) > 0 {
			t.Errorf("%s: default %s: %v", path, f.initial, Errors(d.faults))
		}
	})
	if n < 20 {
		t.Errorf("%d defaults seen", n)
	}
}

func TestSchemaIsStableJSON(t *testing.T) {
	var v map[string]any
	if err := json.Unmarshal(Schema(), &v); err != nil {
		t.Fatal(err)
	}
	if v["$schema"] != "http://json-schema.org/draft-07/schema#" {
		t.Errorf("schema says it is %v", v["$schema"])
	}
	first, second := Schema(), Schema()
	if string(first) != string(second) {
		t.Error("two calls differ")
	}
}

const base = "ledger: l.db\nfeeds:\n  - name: a\n    files: in/*.csv\nranges:\n  - name: own\n"

func parsed(t testing.TB, text string) *Config {
	t.Helper()
	c, err := Parse("/desk/strayd.yaml", []byte(text), testOptions)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// minimal is the smallest configuration with more lines at its end.
func minimal(t testing.TB, more string) *Config {
	t.Helper()
	return parsed(t, base+more)
}

// The defaults that DESIGN.md, section 7, shows.
func TestDefaults(t *testing.T) {
	c := minimal(t, "")
	check := func(what string, got, want any) {
		t.Helper()
		g, _ := json.Marshal(got)
		w, _ := json.Marshal(want)
		if string(g) != string(w) {
			t.Errorf("%s: %s, want %s", what, g, w)
		}
	}
	check("ledger", c.Ledger, "/desk/l.db")
	check("zone", []string{c.Timezone, c.Location.String()}, []string{"UTC", "UTC"})
	check("calendar", c.Calendar, Calendar{Name: "weekdays"})
	check("feed", c.Feeds[0], rules.Feed{Name: "a", Dir: "/desk/in", Pattern: "*.csv", Layout: "long",
		Columns: rules.Columns{Date: "date", Series: "series", Value: "return"}, Value: "return", Unit: "fraction",
		DateStyle: "YYYY-MM-DD", Decimal: '.', Separator: ',', Encoding: "utf-8", Missing: []string{"", "NA", "n/a"}, Settle: time.Minute})
	check("range", c.Ranges[0], rules.Range{Name: "own", Of: "return", Window: 60, Scale: "plain", Decay: 0.94,
		Tail: rules.TailModel{Name: "t", DF: 5}, Predictive: true, Side: "both", Watch: rules.Line{Tail: 0.01},
		Breach: rules.Line{Tail: 0.0027}, Pending: "clip"})
	check("doubtful", c.Doubtful, 0.002)
	check("channels", c.Channels, []rules.Channel{{Name: "console", Kind: "console", After: 15 * time.Minute}})
	check("weekly", minimal(t, "weekly: {}\n").Weekly, Weekly{Schedule: "0 7 * * mon"})
}
