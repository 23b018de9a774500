package config

import (
	"errors"
	"strings"

	"gopkg.in/yaml.v3"
)

// place is where a key and its value stand in the file.
type place struct {
	key, value *yaml.Node
}

// decoder walks one document, remembers where each key stands and gathers the faults.
type decoder struct {
	opt    Options
	folder string
	given  map[string]place // by path; a key that took its default is not in it
	failed map[string]bool  // paths with a fault
	faults []Error
	starts map[string]*yaml.Node // defaults as nodes, by their text
}

// has says whether the file gives the key itself, rather than leaving it to its default.
func (d *decoder) has(path string) bool {
	_, ok := d.given[path]
	return ok
}

// sound says whether nothing is wrong at the paths or below them.
func (d *decoder) sound(paths ...string) bool {
	for _, p := range paths {
		if d.failed[p] {
			return false
		}
	}
	return true
}

// fail records a fault at a node. The paths above it are no longer sound.
func (d *decoder) fail(path string, n *yaml.Node, t trouble) {
	if secret.MatchString(t.message + t.want + t.hint) {
		t = trouble{message: "wrong value", got: "a secret"}
	}
	d.faults = append(d.faults, Error{Line: max(n.Line, 1), Col: max(n.Column, 1), Path: path,
		Message: t.message, Got: t.got, Want: t.want, Hint: t.hint})
	for p := path; ; p = parent(p) {
		d.failed[p] = true
		if p == "" {
			return
		}
	}
}

// failAt records a fault at the value of a path, or at the nearest key above it that the file gives.
func (d *decoder) failAt(path string, t trouble) {
	p := path
	for p != "" && !d.has(p) {
		p = parent(p)
	}
	n := d.given[p].value
	if n == nil {
		n = &yaml.Node{Line: 1, Column: 1}
	}
	d.fail(path, n, t)
}

// parent is the path above: "ranges[0].tail" is in "ranges[0]", which is in "ranges", which is in "".
func parent(path string) string {
	return path[:max(strings.LastIndexAny(path, ".["), 0)]
}

func join(path, key string) string {
	if path == "" {
		return key
	}
	return path + "." + key
}

// wrong records an error of a parse function, with what the shape expects where the error does not say.
func (d *decoder) wrong(path string, n *yaml.Node, err error, want string) {
	t := trouble{message: err.Error(), got: shown(n.Value), want: want}
	var own trouble
	if errors.As(err, &own) {
		t.hint = own.hint
		if own.got != "" {
			t.got = own.got
		}
		if own.want != "" {
			t.want = own.want
		}
	}
	d.fail(path, n, t)
}

// remember keeps where a key stands.
func (d *decoder) remember(path string, key, value *yaml.Node) {
	d.given[path] = place{key, value}
}

// quiet is a decoder for defaults: what it reads is not in the file.
func (d *decoder) quiet() *decoder {
	q := newDecoder(d.opt, d.folder)
	q.starts = d.starts
	return q
}

func newDecoder(opt Options, folder string) *decoder {
	return &decoder{opt: opt, folder: folder, given: map[string]place{}, failed: map[string]bool{}, starts: map[string]*yaml.Node{}}
}

// start is the default of a field as a node.
func (d *decoder) start(f *field) *yaml.Node {
	n, ok := d.starts[f.initial]
	if !ok {
		n = f.start()
		d.starts[f.initial] = n
	}
	return n
}
