package main

import (
	"sync"
	"sync/atomic"
	"time"
)

// beats counts signs of progress, for the watchdog and the health answer.
type beats struct {
	count atomic.Int64
	seen  atomic.Int64
	at    atomic.Pointer[time.Time] // of the last one, by both clocks
	once  sync.Once
	begun chan struct{} // closed at the first
}

func (b *beats) beat() {
	now := time.Now()
	b.count.Add(1)
	b.at.Store(&now)
	b.once.Do(func() { close(b.begun) })
}

// progressed says whether there was a beat since it was asked last.
func (b *beats) progressed() bool {
	now := b.count.Load()
	return b.seen.Swap(now) != now
}

// last is when the last one was, the zero time before the first.
func (b *beats) last() time.Time {
	if at := b.at.Load(); at != nil {
		return *at
	}
	return time.Time{}
}
