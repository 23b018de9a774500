//go:build !linux

package main

import "os"

// resources are measured on Linux only.
func resources(*os.ProcessState) (peak, written int64) { return 0, 0 }
