package config

import (
	"fmt"
	"strings"

	"gopkg.in/yaml.v3"
)

// deepest is how many levels a value may lie below the top; no key needs more than five.
const deepest = 16

// tree refuses the parts of YAML that hide what a file says, wherever they stand: anchors, aliases, merge keys, tags, and keys
// that are given twice or are not plain text.
func (d *decoder) tree(n *yaml.Node, path string) {
	switch {
	case strings.Count(path, ".")+strings.Count(path, "[") > deepest:
		d.fail(path, n, trouble{message: "nested too deeply"})
		return
	case n.Kind == yaml.AliasNode:
		d.fail(path, n, trouble{message: "an alias", got: shown("*" + n.Value), want: "the value itself",
			hint: "put a value that starts with * in quotes"})
		return
	case n.Anchor != "":
		d.fail(path, n, trouble{message: "an anchor", got: shown("&" + n.Anchor), want: "the value alone",
			hint: "put a value that starts with & in quotes"})
	case n.Style&yaml.TaggedStyle != 0:
		d.fail(path, n, trouble{message: "a tag", got: shown(n.Tag), want: "the value alone",
			hint: "put a value that starts with ! in quotes"})
	}
	if n.Kind == yaml.MappingNode {
		d.mapping(n, path)
		return
	}
	for i, item := range n.Content {
		d.tree(item, fmt.Sprintf("%s[%d]", path, i))
	}
}

func (d *decoder) mapping(n *yaml.Node, path string) {
	first := map[string]*yaml.Node{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, value := n.Content[i], n.Content[i+1]
		if key.Kind != yaml.ScalarNode {
			d.fail(path, key, trouble{message: "a key that is not text", got: kindOf(key), want: "a key"})
			continue
		}
		p := join(path, plainKey(key))
		if key.Anchor != "" || key.Style&yaml.TaggedStyle != 0 {
			d.tree(key, p)
		}
		if key.ShortTag() == "!!merge" {
			d.fail(p, key, trouble{message: "a merge key", got: `"<<"`, want: "the keys themselves"})
		}
		if before := first[key.Value]; before != nil {
			d.fail(p, key, trouble{message: "given twice", hint: fmt.Sprintf("first in line %d", before.Line)})
		} else {
			first[key.Value] = key
		}
		d.tree(value, p)
	}
}

// plainKey is a key as a path may repeat it: no secret, nothing that breaks the line, and not without end.
func plainKey(key *yaml.Node) string {
	s := shown(key.Value)
	if bare := strings.TrimSuffix(strings.TrimPrefix(s, `"`), `"`); bare == key.Value && bare != "" {
		return bare
	}
	return s
}

// kindOf names what a node is, for a person.
func kindOf(n *yaml.Node) string {
	switch n.Kind {
	case yaml.MappingNode:
		return "keys"
	case yaml.SequenceNode:
		return "a list"
	case yaml.AliasNode:
		return "an alias"
	}
	if n.ShortTag() == "!!null" {
		return "nothing"
	}
	return shown(n.Value)
}
