package notify

import (
	"context"
	"io"
	"strings"
	"sync"

	"strayd/rules"
)

// Console is a channel that writes notices to a stream, each in one write: its lines, those after the first indented.
type Console struct {
	mu sync.Mutex
	to io.Writer
}

// NewConsole makes a console of a stream.
func NewConsole(to io.Writer) *Console { return &Console{to: to} }

// Post writes the notice. It fails only when the stream does: ambiguously when part of the text was taken.
func (c *Console) Post(_ context.Context, n rules.Notice) (string, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	wrote, err := io.WriteString(c.to, strings.Join(n.Lines, "\n  ")+"\n")
	switch {
	case err == nil:
		return "", nil
	case wrote > 0:
		return "", &Failure{Class: Ambiguous, Reason: err.Error()}
	}
	return "", &Failure{Class: Retry, Reason: err.Error()}
}
