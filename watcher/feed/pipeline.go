package feed

import (
	"io"
	"sync/atomic"
)

// pipeline reads, parses and merges the rest of a file, of which the first chunk is there: one goroutine reads, some parse,
// this one merges in the order of the file.
func (m *merger) pipeline(s *splitter, first *chunk, workers int) error {
	chunks := workers + 2
	work, order, free := make(chan *chunk, chunks), make(chan *chunk, chunks), make(chan *chunk, chunks)
	for range chunks - 1 {
		free <- &chunk{done: make(chan struct{}, 1)}
	}
	var stop atomic.Bool
	var reader any // a panic of the reading goroutine, which goes on in this one, where whoever runs the pass can catch it
	go func() {
		defer close(order)
		defer close(work)
		defer func() { reader = recover() }()
		for c, err := first, error(nil); ; {
			if c.stride = 1; m.wide {
				c.stride = 0
			}
			if c.err = err; err != nil {
				c.done <- struct{}{}
				order <- c
				return
			}
			order <- c
			work <- c
			c = <-free
			if err = s.next(c); err == io.EOF || stop.Load() {
				return
			}
		}
	}()
	for range workers {
		go func() {
			p := m.parser(m.names)
			for c := range work {
				p.guarded(c)
			}
		}()
	}
	err := m.merge(order, free, &stop)
	if reader != nil {
		panic(reader)
	}
	return err
}

// guarded parses a chunk and hands a panic on to whoever merges it.
func (p *parser) guarded(c *chunk) {
	defer func() {
		c.panicked = recover()
		c.done <- struct{}{}
	}()
	p.parse(c)
}

// merge takes every chunk in order until the reader is done. The error is the reader's.
func (m *merger) merge(order <-chan *chunk, free chan<- *chunk, stop *atomic.Bool) (err error) {
	for c := range order {
		<-c.done
		if c.panicked != nil {
			panic(c.panicked)
		}
		if c.err != nil {
			err = c.err
		} else {
			m.take(c)
		}
		if m.bad != nil {
			stop.Store(true)
		}
		free <- c
	}
	return err
}
