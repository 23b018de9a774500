package config

import (
	"encoding/json"
)

// Schema is the JSON Schema (draft-07) of a configuration, made of the same table that Parse walks. It holds the structure, the
// words and the bounds of plain numbers; what ties keys together beyond that only Parse checks.
func Schema() []byte {
	s := table.schema()
	s["$schema"] = "http://json-schema.org/draft-07/schema#"
	s["title"] = "strayd configuration"
	text, err := json.MarshalIndent(s, "", "  ")
	if err != nil {
		panic(err) // maps, strings and numbers only: a table that does not marshal is a mistake in this package
	}
	return append(text, '\n')
}

func (o object) schema() map[string]any {
	properties, dependencies := map[string]any{}, map[string]any{}
	required := []string{}
	for i := range o.fields {
		f := &o.fields[i]
		properties[f.key] = f.property()
		if f.required {
			required = append(required, f.key)
		}
		if f.without != "" {
			dependencies[f.key] = map[string]any{"not": map[string]any{"required": []string{f.without}}}
		}
	}
	s := map[string]any{"type": "object", "additionalProperties": false, "properties": properties}
	if len(required) > 0 {
		s["required"] = required
	}
	if len(dependencies) > 0 {
		s["dependencies"] = dependencies
	}
	if all := o.alternatives(); len(all) > 0 {
		s["allOf"] = all
	}
	return s
}

// property is the shape of a field with its words and its default. An annotation beside $ref-free draft-07 keywords is allowed.
func (f *field) property() map[string]any {
	s := map[string]any{"description": f.doc}
	for k, v := range f.shape.schema() {
		s[k] = v
	}
	if f.initial != "" {
		var v any
		if err := f.start().Decode(&v); err == nil {
			s["default"] = v
		}
	}
	return s
}

// alternatives says of each choice that exactly one of its keys is given.
func (o object) alternatives() (all []any) {
	for _, keys := range o.choices() {
		var one []any
		for _, k := range keys {
			one = append(one, map[string]any{"required": []string{k}})
		}
		all = append(all, map[string]any{"oneOf": one})
	}
	return all
}

func (l list[T]) schema() map[string]any {
	s := map[string]any{"type": "array", "items": l.item.schema()}
	if l.least > 0 {
		s["minItems"] = l.least
	}
	if l.most > 0 {
		s["maxItems"] = l.most
	}
	if l.unique {
		s["uniqueItems"] = true
	}
	return s
}

func (o oneOf) schema() map[string]any {
	return map[string]any{"anyOf": []any{o.word.schema(), o.keys.schema()}}
}
