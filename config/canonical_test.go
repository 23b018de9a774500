package config

import (
	"bytes"
	"encoding/json"
	"strings"
	"testing"
)

const spelledOut = `# the same, said in another order and in other words
ranges:
  - breach: {tail: 27bp}    # same
    watch: {tail: 0.01}
    name: own
    tail: {t: 5}
    window: 60
  - {limit: [-0.5, 5000bp], name: hard, of: return}
channels:
  - {name: elsewhere, console: {}}
doubtful: 20bp
groups:
  - {series: [b, "a*"], name: g, owner: someone}
feeds:
  - name: other
    files: elsewhere/*.csv
    missing: [n/a, NA, ""]
    settle: 5m
    unit: fraction
ledger: other.db
timezone: Europe/Zurich
`

const said = `ledger: l.db
feeds:
  - name: a
    files: in/*.csv
groups:
  - name: g
    series: ["a*", b]
ranges:
  - name: own
  - name: hard
    limit: [-50%, 50%]
`

func judged(c *Config) []byte {
	s := c.Settings()
	return s.Text()
}

func TestJudgingIsTheSameForTheSameMeaning(t *testing.T) {
	a, b := parsed(t, said), parsed(t, spelledOut)
	if !bytes.Equal(judged(a), judged(b)) {
		t.Errorf("\n%s\n%s", judged(a), judged(b))
	}
	if a.FeedKey("a") != b.FeedKey("other") {
		t.Error("feeds that read alike have two keys")
	}
	if !json.Valid(judged(a)) {
		t.Errorf("not JSON: %s", judged(a))
	}
}

// Whatever decides a verdict changes the bytes.
func TestJudgingSeesEveryChange(t *testing.T) {
	seen := map[string]string{string(judged(parsed(t, said))): "nothing"}
	for _, change := range []struct{ from, to string }{
		{"- name: own", "- name: mine"},
		{"- name: own", "- name: own\n    window: 61"},
		{"- name: own", "- name: own\n    scale: mad"},
		{"- name: own", "- name: own\n    scale: weighted"},
		{"- name: own", "- name: own\n    scale: weighted\n    decay: 0.95"},
		{"- name: own", "- name: own\n    tail: normal"},
		{"- name: own", "- name: own\n    tail: {t: 4}"},
		{"- name: own", "- name: own\n    predictive: false"},
		{"- name: own", "- name: own\n    side: lower"},
		{"- name: own", "- name: own\n    watch: {tail: 2%}"},
		{"- name: own", "- name: own\n    breach: {confidence: 99.9%}"},
		{"- name: own", "- name: own\n    breach: {budget: 3 a week}"},
		{"- name: own", "- name: own\n    breach: {z: 5}"},
		{"- name: own", "- name: own\n    pending: keep"},
		{"- name: own", "- name: own\n    of: residual"},
		{"- name: own", "- name: own\n    for: [g]"},
		{"[-50%, 50%]", "[-50%, 50.0000000000001%]"},
		{"- name: g", "- name: g\n    reference: none"},
		{`["a*", b]`, `["a*"]`},
		{"ledger:", "doubtful: 0.1%\nledger:"},
		{"ledger:", "calendar: DE\nledger:"},
	} {
		text := strings.Replace(said, change.from, change.to, 1)
		got := string(judged(parsed(t, text)))
		if other, ok := seen[got]; ok {
			t.Errorf("%q gives the bytes of %q", change.to, other)
		}
		seen[got] = change.to
	}
}

func TestFeedKeySeesWhatChangesReading(t *testing.T) {
	seen := map[string]string{parsed(t, said).FeedKey("a"): "nothing"}
	for _, line := range []string{"layout: wide", "columns: {date: d}", "columns: {status: s}", "columns: {days: n}", "value: price",
		"unit: percent", "date: YYYYMMDD", "separator: ;", `decimal: ","` + "\n    separator: tab", "encoding: latin-1", `missing: [""]`,
		"bad_rows: {skip: 1%}", "sheet: returns"} {
		key := parsed(t, strings.Replace(said, "groups:", "    "+line+"\ngroups:", 1)).FeedKey("a")
		if other, ok := seen[key]; ok || key == "" {
			t.Errorf("%q gives the key of %q", line, other)
		}
		seen[key] = line
	}
	if key := parsed(t, said).FeedKey("nobody"); key != "" {
		t.Errorf("key of no feed: %s", key)
	}
}
