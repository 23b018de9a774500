package main

import (
	"os"
	"syscall"
)

// resources gives the peak memory and the bytes written to disk of a process that has ended.
func resources(p *os.ProcessState) (peak, written int64) {
	r := p.SysUsage().(*syscall.Rusage)
	return int64(r.Maxrss) << 10, int64(r.Oublock) * 512
}
