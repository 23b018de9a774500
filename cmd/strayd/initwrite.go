package main

import (
	"fmt"
	"path"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher/sample"
)

// confirmMark stands in a written configuration wherever the samples prove nothing.
const confirmMark = "CONFIRM"

// configText is a configuration in a folder that reads the drafts' files, with what each line rests on above it.
func configText(drafts []*draft, folder string, now time.Time) string {
	b := new(strings.Builder)
	files := 0
	for _, d := range drafts {
		files += len(d.files)
	}
	fmt.Fprintf(b, `# Written by `+"`strayd init`"+` on %s from %s. Paths are relative to this file.
# Above each line of a feed stands what it rests on: sure, likely or a guess. %s marks what the samples cannot prove:
# look at it, put it right where it is wrong, and take the mark away. `+"`strayd check --settled`"+` shows the first rows as understood.
ledger: ledger.db                 # everything that is read and judged is kept here
timezone: UTC                     # of schedules and deadlines; %s: yours may be another, such as Europe/Zurich

feeds:
`, rules.DateFrom(now), rules.Counted(files, "sample"), confirmMark, confirmMark)
	for _, d := range drafts {
		d.write(b, folder)
	}
	b.WriteString(`ranges:
  - name: own                     # what each series' own past leads one to expect
    window: 60                    # observations, the one judged never among them
    tail: t5                      # heavier than normal, as returns are
    watch: {tail: 1%}             # about once in 100 days: counted and shown
    breach: {tail: 0.27%}         # about once in 370 days: flagged
  - name: hard                    # whatever the past says
    limit: [-50%, 50%]

# Groups make flags say more: with peers or a benchmark, a common move is told from an error.
# groups:
#   - {name: equity, series: ["alder-*"], reference: peers}

channels:
  - name: console
    console: {}
`)
	return b.String()
}

func (d *draft) write(b *strings.Builder, folder string) {
	f := d.finding.Feed
	fmt.Fprintf(b, "  - name: %s\n", yamlText(d.name))
	d.writeFiles(b, folder)
	if d.schedule != "" {
		remark(b, sample.Remark{Sure: sample.Likely, Why: "the samples came at such times of the day (UTC, by the times of the files)", Confirm: true})
		fmt.Fprintf(b, "    schedule: %s\n", yamlText(d.schedule))
	} else {
		b.WriteString("    # schedule: \"*/10 17-20 * * mon-fri\"     when the daemon looks; the samples' times do not say\n")
	}
	for _, key := range feedKeys(f) {
		remark(b, d.finding.Of(key.name))
		fmt.Fprintf(b, "    %s: %s\n", key.name, key.value)
	}
	b.WriteString("    settle: 60s                   # a younger file may still be growing\n\n")
}

func (d *draft) writeFiles(b *strings.Builder, folder string) {
	where := d.dir
	if rel, err := filepath.Rel(folder, d.dir); err == nil {
		where = rel
	}
	pattern := path.Join(filepath.ToSlash(where), d.pattern)
	r := sample.Remark{Sure: sample.Likely, Why: fmt.Sprintf("from the names of %s: %s", rules.Counted(len(d.files), "sample"), d.files[0].name)}
	if !strings.ContainsAny(d.pattern, "*?") {
		r.Sure, r.Confirm = sample.Guess, true
		r.Why = "one name without a date in it: how will tomorrow's file be called? A pattern such as *" + path.Ext(d.pattern) + " takes in many"
	}
	remark(b, r)
	fmt.Fprintf(b, "    files: %s\n", yamlText(pattern))
}

// remark writes what the next line rests on.
func remark(b *strings.Builder, r sample.Remark) {
	if r.Why == "" {
		return
	}
	mark := ""
	if r.Confirm {
		mark = confirmMark + ", "
	}
	fmt.Fprintf(b, "    # %s%s: %s\n", mark, r.Sure, oneLine(r.Why))
}

// oneLine makes a text from other people's files safe for a comment.
func oneLine(s string) string { return strings.Join(strings.Fields(printable(s)), " ") }

// keyValue is one key of a feed as it is written.
type keyValue struct{ name, value string }

func feedKeys(f rules.Feed) []keyValue {
	keys := []keyValue{{"layout", string(f.Layout)}, {"columns", columnsText(f.Columns)}, {"value", string(f.Value)}}
	if f.Value != rules.OfPrice {
		keys = append(keys, keyValue{"unit", string(f.Unit)})
	}
	keys = append(keys, keyValue{"date", yamlText(f.DateStyle)}, keyValue{"decimal", quoteJSON(string(f.Decimal))})
	if f.Separator != 0 {
		keys = append(keys, keyValue{"separator", quoteJSON(string(f.Separator))}, keyValue{"encoding", f.Encoding})
	}
	missing := make([]string, len(f.Missing))
	for i, m := range f.Missing {
		missing[i] = quoteJSON(m)
	}
	return append(keys, keyValue{"missing", "[" + strings.Join(missing, ", ") + "]"})
}

func columnsText(c rules.Columns) string {
	var parts []string
	for _, k := range []keyValue{{"date", c.Date}, {"series", c.Series}, {"value", c.Value}, {"status", c.Status}, {"days", c.Days}} {
		if k.value != "" {
			parts = append(parts, k.name+": "+yamlText(k.value))
		}
	}
	return "{" + strings.Join(parts, ", ") + "}"
}

var plainYAML = regexp.MustCompile(`^[A-Za-z][A-Za-z0-9_/*.-]*$`)

// yamlText writes a text bare where that can mean nothing else.
func yamlText(s string) string {
	words := []string{"y", "n", "yes", "no", "on", "off", "true", "false", "null"}
	if plainYAML.MatchString(s) && !slices.Contains(words, strings.ToLower(s)) {
		return s
	}
	return quoteJSON(s)
}

// sayDrafts tells what was seen.
func (a *app) sayDrafts(drafts []*draft) {
	for _, d := range drafts {
		rows := 0
		for _, s := range d.files {
			rows += s.rows
		}
		fmt.Fprintf(a.out, "feed %s: %s from %s, as %s\n", d.name, rules.Counted(rows, "row"), rules.Counted(len(d.files), "sample"), d.pattern)
		if d.others > 0 {
			fmt.Fprintf(a.out, "  the pattern takes in %s more that lie there\n", rules.Counted(d.others, "file"))
		}
		w := columns(a.out)
		for _, k := range feedKeys(d.finding.Feed) {
			r := d.finding.Of(k.name)
			mark := ""
			if r.Confirm {
				mark = confirmMark
			}
			fields(w, "  "+k.name, printable(k.value), string(r.Sure), mark, oneLine(r.Why))
		}
		w.Flush() //nolint:errcheck // as every line to the person
	}
}
