package main

import (
	"os"
	"runtime/debug"
)

// gcPercent is how much garbage there may be for what is in use, as GOGC gives it. Most of a pass's memory are columns, which hold no
// pointers, so that collecting more often than by default costs next to nothing; the peak of a large load is a tenth lower.
const gcPercent = 20

// collectOften sets gcPercent, unless GOGC says otherwise.
func collectOften() {
	if os.Getenv("GOGC") == "" {
		debug.SetGCPercent(gcPercent)
	}
}
