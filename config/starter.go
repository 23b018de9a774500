package config

import _ "embed"

// Starter is a configuration to begin with: short, commented, one feed, an own range and a limit, and the console.
//
//go:embed default.yaml
var Starter string
