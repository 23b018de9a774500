package feed

import (
	"math"
	"runtime"
	"time"

	"strayd/watcher"
)

// Options bounds and watches one reading. The zero value works: every zero stands for the default beside it.
type Options struct {
	Now      time.Time               // a date more than a day after it is refused; the clock
	Progress func(done, total int64) // called with the bytes read from disk; none
	Workers  int                     // chunks parsed at a time; the processors, at most 4
	Limits   Limits
	Grids    map[string]watcher.OpenGrid // what opens files that are no text, by the lower-case ending of their names, such as .xlsx; none
	chunk    int                         // bytes a chunk, for tests; chunkBytes
}

// Limits are the bounds on a file. Each error names the limit that it broke.
type Limits struct {
	FileBytes  int64  // on disk; 8 GiB
	TextBytes  int64  // decompressed and decoded; 8 GiB
	LineBytes  int    // a record with its quoted newlines; 64 KiB in a long file, 32 MiB in a wide one
	CellBytes  int    // one cell; 64 KiB
	NameBytes  int    // the name of a series; 256
	Columns    int    // of the header; 1,024 in a long file, 1,000,001 in a wide one
	Lines      uint32 // of the file; 2^32-2
	SheetBytes int64  // memory for the values of one file; 2 GiB
	Ratio      int64  // of decompressed to compressed bytes, beyond the first MiB; 200
}

const (
	chunkBytes = 1 << 19
	maxWorkers = 4
)

func (o Options) filled(wide bool) Options {
	l := &o.Limits
	orElse(&l.FileBytes, 8<<30)
	orElse(&l.TextBytes, 8<<30)
	orElse(&l.CellBytes, 64<<10)
	orElse(&l.NameBytes, 256)
	orElse(&l.Lines, math.MaxUint32-1)
	orElse(&l.SheetBytes, 2<<30)
	orElse(&l.Ratio, 200)
	if wide {
		orElse(&l.LineBytes, 32<<20)
		orElse(&l.Columns, 1_000_001)
	} else {
		orElse(&l.LineBytes, 64<<10)
		orElse(&l.Columns, 1024)
	}
	orElse(&o.Workers, min(runtime.GOMAXPROCS(0), maxWorkers))
	orElse(&o.chunk, chunkBytes)
	if o.Now.IsZero() {
		o.Now = time.Now()
	}
	return o
}

func orElse[T int | int64 | uint32](v *T, def T) {
	if *v == 0 {
		*v = def
	}
}
