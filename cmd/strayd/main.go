// Command strayd flags daily investment returns that lie outside their expected ranges.
package main

import (
	"context"
	"os"
	"os/signal"
	"runtime/debug"
	"syscall"
	_ "time/tzdata" // zones also where the system has none
)

// gcPercent is how much garbage there may be for what is in use, as GOGC gives it. Most of a pass's memory are columns, which hold no
// pointers, so that collecting more often than by default costs next to nothing; the peak of a large load is a tenth lower.
const gcPercent = 40

func main() {
	if os.Getenv("GOGC") == "" {
		debug.SetGCPercent(gcPercent)
	}
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	os.Exit(run(ctx, os.Args[1:], os.Stdout, os.Stderr))
}
