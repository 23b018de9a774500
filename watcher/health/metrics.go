package health

import (
	"bytes"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
)

// family is one metric with its samples, as OpenMetrics 1.0 writes it.
type family struct {
	name string // ends with the unit where there is one
	kind string // gauge, counter or info
	unit string
	help string
	of   func(*look) []sample
}

// sample is one figure, under at most one label.
type sample struct {
	label, value string
	n            float64
}

// metrics is the page /metrics.
func (l *look) metrics() []byte {
	var b bytes.Buffer
	for _, f := range families() {
		f.write(&b, l)
	}
	b.WriteString("# EOF\n")
	return b.Bytes()
}

// suffixes are what the samples of a kind add to the name of their family.
var suffixes = map[string]string{"counter": "_total", "info": "_info"}

func (f *family) write(b *bytes.Buffer, l *look) {
	b.WriteString("# TYPE " + f.name + " " + f.kind + "\n")
	if f.unit != "" {
		b.WriteString("# UNIT " + f.name + " " + f.unit + "\n")
	}
	b.WriteString("# HELP " + f.name + " " + escape(f.help) + "\n")
	for _, s := range f.of(l) {
		b.WriteString(f.name + suffixes[f.kind])
		if s.label != "" {
			b.WriteString("{" + s.label + `="` + escape(s.value) + `"}`)
		}
		b.WriteString(" " + strconv.FormatFloat(s.n, 'f', -1, 64) + "\n")
	}
}

// escape writes a text as a label value or help: OpenMetrics 1.0, "escaped-string". What is not UTF-8 is replaced.
func escape(s string) string {
	return strings.NewReplacer(`\`, `\\`, `"`, `\"`, "\n", `\n`).Replace(strings.ToValidUTF8(s, "\uFFFD"))
}

// one is a single figure without a label.
func one(n func(*look) float64) func(*look) []sample {
	return func(l *look) []sample { return []sample{{n: n(l)}} }
}

// at is a time in seconds since 1970, and no figure when there is none.
func at(t func(*look) time.Time) func(*look) []sample {
	return func(l *look) []sample { return timed(sample{}, t(l)) }
}

func jobs(n func(*look, *Job) float64) func(*look) []sample {
	return func(l *look) []sample {
		return each(l.Jobs, func(j Job) sample { return sample{"job", j.Name, n(l, &j)} })
	}
}

func jobTimes(t func(*Job) time.Time) func(*look) []sample {
	return func(l *look) []sample {
		var all []sample
		for _, j := range l.Jobs {
			all = append(all, timed(sample{label: "job", value: j.Name}, t(&j))...)
		}
		return all
	}
}

func channels(n func(*look, *Channel) float64) func(*look) []sample {
	return func(l *look) []sample {
		return each(l.Channels, func(c Channel) sample { return sample{"channel", c.Name, n(l, &c)} })
	}
}

func feedTimes(l *look) []sample {
	var all []sample
	for _, f := range l.Feeds {
		all = append(all, timed(sample{label: "feed", value: f.Name}, f.At)...)
	}
	return all
}

func passFiles(l *look) []sample {
	p := l.Pass
	return []sample{{"fate", "accepted", float64(p.Accepted)}, {"fate", "refused", float64(p.Refused)}, {"fate", "waiting", float64(p.Waiting)}}
}

func passVerdicts(l *look) []sample { return tally("finding", findings(), l.Pass.Verdicts) }
func passFlags(l *look) []sample    { return tally("kind", rules.Kinds, l.Pass.Flags) }
func openFlags(l *look) []sample    { return tally("kind", rules.Kinds, l.OpenFlags) }

// tally has a figure for every one of the words and for no other.
func tally[W ~string](label string, words []W, n map[W]int) []sample {
	return each(words, func(w W) sample { return sample{label, string(w), float64(n[w])} })
}

// timed is a sample of a time, or none when there is no time.
func timed(s sample, t time.Time) []sample {
	if t.IsZero() {
		return nil
	}
	s.n = float64(t.UnixMilli()) / 1000
	return []sample{s}
}

func yes(b bool) float64 {
	if b {
		return 1
	}
	return 0
}
