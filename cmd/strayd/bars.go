package main

import (
	"io"
	"os"
	"sync"

	"github.com/schollz/progressbar/v3"
	"golang.org/x/term"
)

// bars shows long work on stderr when that is a terminal, one bar at a time.
type bars struct {
	w    io.Writer
	mu   sync.Mutex
	work string
	bar  *progressbar.ProgressBar
}

// newBars gives bars that stay silent when w is no terminal.
func newBars(w io.Writer) *bars {
	if f, ok := w.(*os.File); !ok || !term.IsTerminal(int(f.Fd())) {
		return &bars{}
	}
	return &bars{w: w}
}

func (b *bars) progress(work string, done, total int64) {
	if b.w == nil {
		return
	}
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.bar == nil || b.work != work {
		b.work = work
		b.bar = progressbar.NewOptions64(total, progressbar.OptionSetWriter(b.w), progressbar.OptionSetDescription(work),
			progressbar.OptionClearOnFinish(), progressbar.OptionThrottle(100e6), progressbar.OptionSetWidth(30))
	}
	b.bar.Set64(done) //nolint:errcheck // a bar that cannot be drawn stops nothing
}

// clear takes the bar away before other words are written.
func (b *bars) clear() {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.bar != nil {
		b.bar.Clear() //nolint:errcheck // as above
		b.bar = nil
	}
}
