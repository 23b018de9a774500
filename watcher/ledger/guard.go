package ledger

import (
	"errors"
	"fmt"
	"runtime/debug"
)

// guard turns a panic of the deferring function into *Damaged: bbolt panics on pages that make no sense, and a fault in the
// mapped file (cut short, unreadable disk) is made a panic. Use: defer guard(path, debug.SetPanicOnFault(true), &err).
func guard(path string, faults bool, err *error) {
	debug.SetPanicOnFault(faults)
	if r := recover(); r != nil {
		*err = &Damaged{Path: path, Why: fmt.Sprintf("a page cannot be read (%v)", r)}
		return
	}
	name(path, *err)
}

// name puts the path into a *Damaged that does not know it yet.
func name(path string, err error) {
	var d *Damaged
	if err != nil && errors.As(err, &d) && d.Path == "" {
		d.Path = path
	}
}
