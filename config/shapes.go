package config

import (
	"fmt"

	"gopkg.in/yaml.v3"
)

// list is a list of values of one shape; T is what an element becomes.
type list[T any] struct {
	item        shape
	least, most int  // most 0: no bound
	unique      bool // no scalar twice
	what        string
}

func (l list[T]) want() string { return l.what }

func (l list[T]) read(d *decoder, path string, n *yaml.Node, dst any) {
	if n.Kind != yaml.SequenceNode {
		d.kind(path, n, l)
		return
	}
	if c := len(n.Content); c < l.least || l.most > 0 && c > l.most {
		d.fail(path, n, trouble{message: "wrong number of entries", got: fmt.Sprint(c), want: l.what})
		return
	}
	values, seen := make([]T, len(n.Content)), map[string]bool{}
	for i, item := range n.Content {
		p := fmt.Sprintf("%s[%d]", path, i)
		d.remember(p, item, item)
		l.item.read(d, p, item, &values[i])
		if l.unique && item.Kind == yaml.ScalarNode && seen[item.Value] {
			d.fail(p, item, trouble{message: "given twice", got: shown(item.Value)})
		}
		seen[item.Value] = true
	}
	put(dst, values)
}

// scalar is one value that is written as text, a number or a boolean.
type scalar[T any] struct {
	what  string
	parse func(d *decoder, n *yaml.Node) (T, error)
	json  map[string]any
}

func (s scalar[T]) want() string           { return s.what }
func (s scalar[T]) schema() map[string]any { return s.json }

func (s scalar[T]) read(d *decoder, path string, n *yaml.Node, dst any) {
	if n.Kind != yaml.ScalarNode || n.ShortTag() == "!!null" {
		d.kind(path, n, s)
		return
	}
	v, err := s.parse(d, n)
	if err != nil {
		d.wrong(path, n, err, s.what)
		return
	}
	put(dst, v)
}

// oneOf is a word, or keys of its own.
type oneOf struct {
	word shape
	keys object
}

func (o oneOf) want() string { return o.word.want() + ", or " + o.keys.want() }

func (o oneOf) read(d *decoder, path string, n *yaml.Node, dst any) {
	switch n.Kind {
	case yaml.MappingNode:
		o.keys.read(d, path, n, dst)
	case yaml.ScalarNode:
		o.word.read(d, path, n, dst)
	default:
		d.kind(path, n, o)
	}
}

// inside is the object within a shape, if it has one.
func inside(s shape) (object, bool) {
	switch s := s.(type) {
	case object:
		return s, true
	case oneOf:
		return s.keys, true
	case interface{ element() shape }:
		return inside(s.element())
	}
	return object{}, false
}

func (l list[T]) element() shape { return l.item }
