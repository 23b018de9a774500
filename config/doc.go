// Package config turns one strict YAML file into checked values. It is the only door to the YAML library.
//
// The table is the one list of keys: what each may hold, its default and what it means. A shape is what a value must look like;
// the walker reads it and the JSON Schema describes it. A path names a key within the file, such as ranges[0].window.
//
// Traps that are closed here: nothing is converted silently (1.5 is no integer, 010 and 1_000 are no numbers, yes is no boolean,
// an empty value is no default); anchors, aliases, merge keys, tags and second documents are refused; every fault is reported at
// once with its line and column; secrets are refused and never repeated in an error. Shares and returns are fractions.
package config
