package config

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Whatever the text: no panic; every error has a place in the text, in order, and repeats no secret; and what Parse takes the
// schema takes as well.
func FuzzParse(f *testing.F) {
	paths, _ := filepath.Glob("testdata/*/*.yaml")
	more, _ := filepath.Glob("testdata/*.yaml")
	for _, p := range append(paths, more...) {
		data, err := os.ReadFile(p)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(data)
	}
	schema := compiled(f)
	f.Fuzz(func(t *testing.T, data []byte) {
		c, err := Parse("testdata/x.yaml", data, testOptions)
		if err == nil {
			if v, err := asJSON(data); err != nil || schema.Validate(v) != nil {
				t.Fatalf("taken, but the schema says %v, %v", err, schema.Validate(v))
			}
			judged(c)
			return
		}
		var all Errors
		if !errors.As(err, &all) || len(all) == 0 {
			t.Fatalf("%v is not Errors", err)
		}
		lines := 1 + strings.Count(string(data), "\n") + strings.Count(string(data), "\r") +
			strings.Count(string(data), "\u0085") + strings.Count(string(data), "\u2028") + strings.Count(string(data), "\u2029")
		last := 0
		for _, e := range all {
			if e.Line < max(last, 1) || e.Col < 1 || e.Line > lines || secret.MatchString(e.Error()) || strings.ContainsAny(e.Error(), "\n\r") {
				t.Fatalf("bad error %q", e.Error())
			}
			last = e.Line
		}
	})
}

// Whatever is set, the answer is a checked configuration or words about what is wrong.
func FuzzSet(f *testing.F) {
	for _, s := range []string{"ranges.own.window=120", "ranges.0={name: x}", "groups=[]", "ranges.own.breach={tail: 0.5%}", "a=b", "=",
		"ranges.own=&a [*a]", "feeds.book.due.at=9"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, line string) {
		opt := testOptions
		opt.Set = []string{line, line}
		c, err := Parse("strayd.yaml", []byte(setText), opt)
		var bad Errors
		if (c == nil) != (err != nil) || err != nil && !errors.As(err, &bad) {
			t.Errorf("%q: %v, %v", line, c, err)
		}
	})
}
