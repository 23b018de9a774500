package config

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"gopkg.in/yaml.v3"
)

// set puts single lines in place of the document's: PATH=VALUE, where the path names keys, and items of a list by their name or number:
// ranges.own.breach={tail: 0.5%}. A key that is not there is added.
func (d *decoder) set(root *yaml.Node, lines []string) {
	for _, line := range lines {
		path, text, ok := strings.Cut(line, "=")
		if !ok || strings.TrimSpace(path) == "" {
			d.fail("", at(1, 1), trouble{message: "not a line to set", got: shown(line), want: "PATH=VALUE, such as ranges.own.window=120"})
			continue
		}
		value, err := decode(yaml.NewDecoder(strings.NewReader(text)))
		if err != nil {
			d.fail("", at(1, 1), trouble{message: "the value to set is not YAML", got: shown(line), want: "PATH=VALUE"})
			continue
		}
		if err := putAt(root, strings.Split(strings.TrimSpace(path), "."), value.Content[0]); err != nil {
			d.fail("", at(1, 1), trouble{message: err.Error(), got: shown(line), want: "a path of the configuration"})
		}
	}
}

// putAt puts a value at a path below a node.
func putAt(n *yaml.Node, path []string, value *yaml.Node) error {
	if n.Kind == yaml.SequenceNode {
		at := itemAt(n, path[0])
		switch {
		case at < 0:
			return fmt.Errorf("no item %q to set", path[0])
		case len(path) == 1:
			n.Content[at] = moved(value, n.Content[at])
			return nil
		}
		return putAt(n.Content[at], path[1:], value)
	}
	if n.Kind != yaml.MappingNode {
		return fmt.Errorf("nothing lies below the value before %q", path[0])
	}
	for i := 0; i+1 < len(n.Content); i += 2 {
		if n.Content[i].Value != path[0] {
			continue
		}
		if len(path) == 1 {
			n.Content[i+1] = moved(value, n.Content[i+1])
			return nil
		}
		return putAt(n.Content[i+1], path[1:], value)
	}
	if len(path) > 1 {
		return fmt.Errorf("no key %q to set something below", path[0])
	}
	key := moved(&yaml.Node{Kind: yaml.ScalarNode, Tag: "!!str", Value: path[0]}, n)
	n.Content = append(n.Content, key, moved(value, n))
	return nil
}

// itemAt is the item of a list with a name, or a number from 0; -1 for none.
func itemAt(list *yaml.Node, word string) int {
	named := slices.IndexFunc(list.Content, func(item *yaml.Node) bool {
		for i := 0; i+1 < len(item.Content); i += 2 {
			if item.Content[i].Value == "name" && item.Content[i+1].Value == word {
				return true
			}
		}
		return false
	})
	if n, err := strconv.Atoi(word); named < 0 && err == nil && n >= 0 && n < len(list.Content) {
		return n
	}
	return named
}

// moved gives a value the place of another in the file, so that a fault in it is told there.
func moved(value, to *yaml.Node) *yaml.Node {
	value.Line, value.Column = to.Line, to.Column
	for _, n := range value.Content {
		moved(n, to)
	}
	return value
}
