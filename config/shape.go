package config

import (
	"fmt"
	"slices"
	"strings"

	"gopkg.in/yaml.v3"
)

// shape is what a value must look like. read checks a node and puts what it holds at dst; want says in words what is expected;
// schema is the same as JSON Schema.
type shape interface {
	read(d *decoder, path string, n *yaml.Node, dst any)
	want() string
	schema() map[string]any
}

// field is one key of an object: a row of the table.
type field struct {
	key      string
	doc      string
	shape    shape
	at       func(any) any // where the value goes, within what the object fills
	required bool
	initial  string // the default, as YAML; "" for none
	choice   string // of the fields with the same word exactly one is given
	without  string // the key beside which this one may not stand
}

// in turns a typed place within T into an untyped one. The place is a pointer, or a function that takes the value.
func in[T any](place func(*T) any) func(any) any {
	return func(dst any) any { return place(dst.(*T)) }
}

// put stores v where a field's place says.
func put[T any](dst any, v T) {
	if take, ok := dst.(func(T)); ok {
		take(v)
		return
	}
	*dst.(*T) = v
}

// object is a set of keys.
type object struct {
	fields []field
	what   string // in words
}

func (o object) want() string { return o.what }

func (o object) read(d *decoder, path string, n *yaml.Node, dst any) {
	if n.Kind != yaml.MappingNode {
		d.kind(path, n, o)
		return
	}
	given := o.match(d, path, n)
	for i := range o.fields {
		f, p := &o.fields[i], join(path, o.fields[i].key)
		switch pair, ok := given[f.key]; {
		case ok:
			d.remember(p, pair.key, pair.value)
			f.shape.read(d, p, pair.value, f.at(dst))
		case f.required:
			d.fail(path, n, trouble{message: "missing key " + f.key, want: f.shape.want()})
		case f.initial != "" && !has(given, f.without):
			f.shape.read(d.quiet(), p, d.start(f), f.at(dst))
		}
	}
	o.exclude(d, path, given)
	o.choose(d, path, n, given)
}

func has(given map[string]place, key string) bool {
	_, ok := given[key]
	return ok
}

// start is the default as a node.
func (f *field) start() *yaml.Node {
	var doc yaml.Node
	if err := yaml.Unmarshal([]byte(f.initial), &doc); err != nil || len(doc.Content) != 1 {
		return &yaml.Node{}
	}
	return doc.Content[0]
}

// match finds the known keys of a node and refuses the others. Of a key given twice the first counts.
func (o object) match(d *decoder, path string, n *yaml.Node) map[string]place {
	given := map[string]place{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, value := n.Content[i], n.Content[i+1]
		switch {
		case key.Kind != yaml.ScalarNode || key.ShortTag() == "!!merge" || has(given, key.Value):
		case o.knows(key.Value):
			given[key.Value] = place{key: key, value: value}
		default:
			d.fail(join(path, plainKey(key)), key, o.unknown(key.Value))
		}
	}
	return given
}

func (o object) knows(key string) bool {
	return slices.ContainsFunc(o.fields, func(f field) bool { return f.key == key })
}

func (o object) keys() []string {
	keys := make([]string, len(o.fields))
	for i, f := range o.fields {
		keys[i] = f.key
	}
	return keys
}

func (o object) unknown(key string) trouble {
	t := trouble{message: "unknown key", got: shown(key), want: "no keys"}
	if near := nearest(key, o.keys()); near != "" {
		t.want = near
	} else if len(o.fields) > 0 {
		t.want = "one of " + strings.Join(o.keys(), ", ")
	}
	if home := table.home(key, ""); home != "" {
		t.hint = key + " stands under " + home
	}
	return t
}

// home is where in the table a key stands, when that is one place only.
func (o object) home(key, path string) string {
	var found []string
	for _, f := range o.fields {
		p := join(path, f.key)
		if f.key == key && path != "" {
			found = append(found, path)
		}
		if inner, ok := inside(f.shape); ok {
			found = append(found, inner.home(key, p))
		}
	}
	found = slices.DeleteFunc(slices.Compact(found), func(s string) bool { return s == "" })
	if len(found) != 1 {
		return ""
	}
	return found[0]
}

// exclude refuses keys beside a key that rules them out.
func (o object) exclude(d *decoder, path string, given map[string]place) {
	for _, f := range o.fields {
		if pair, ok := given[f.key]; ok && has(given, f.without) {
			d.fail(join(path, f.key), pair.key, trouble{message: "may not stand beside " + f.without})
		}
	}
}

// choose holds the choices: of each exactly one key is given.
func (o object) choose(d *decoder, path string, n *yaml.Node, given map[string]place) {
	for _, keys := range o.choices() {
		var found []string
		for _, k := range keys {
			if has(given, k) {
				found = append(found, k)
			}
		}
		if len(found) != 1 {
			d.fail(path, n, trouble{message: fmt.Sprintf("%d of the forms of a %s", len(found), o.choiceOf(keys[0])),
				got: either(strings.Join(found, ", "), "none"), want: "exactly one of " + strings.Join(keys, ", ")})
		}
	}
}

func either(s, empty string) string {
	if s == "" {
		return empty
	}
	return s
}

func (o object) choiceOf(key string) string {
	i := slices.IndexFunc(o.fields, func(f field) bool { return f.key == key })
	return o.fields[i].choice
}

// choices are the keys of each choice.
func (o object) choices() (all [][]string) {
	index := map[string]int{}
	for _, f := range o.fields {
		if f.choice == "" {
			continue
		}
		i, ok := index[f.choice]
		if !ok {
			i = len(all)
			index[f.choice] = i
			all = append(all, nil)
		}
		all[i] = append(all[i], f.key)
	}
	return all
}

// kind refuses a node of another kind than the shape's.
func (d *decoder) kind(path string, n *yaml.Node, s shape) {
	t := trouble{message: "wrong kind of value", got: kindOf(n), want: s.want()}
	switch {
	case n.Kind == yaml.AliasNode:
		d.failed[path] = true
		return // has its error
	case n.ShortTag() == "!!null":
		t.message = "no value"
		t.hint = "a # begins a comment: put a value that starts with it in quotes"
		if n.Value != "" {
			t.hint = "put " + shown(n.Value) + " in quotes if it is meant as text"
		}
	}
	d.fail(path, n, t)
}
