package notify

import (
	"context"
	"errors"
	"strings"
	"testing"

	"strayd/rules"
)

// torn is a stream that takes so many bytes, then fails.
type torn struct{ takes int }

func (w torn) Write(b []byte) (int, error) {
	if w.takes < len(b) {
		return w.takes, errors.New("broken pipe")
	}
	return len(b), nil
}

func TestConsole(t *testing.T) {
	var to strings.Builder
	n := rules.Notice{Lines: []string{"BREACH alder", "second", "third"}}
	c := NewConsole(&to)
	for range 2 {
		if _, err := c.Post(context.Background(), n); err != nil {
			t.Fatal(err)
		}
	}
	one := "BREACH alder\n  second\n  third\n"
	equal(t, "text", to.String(), one+one)
	for takes, want := range map[int]Class{0: Retry, 5: Ambiguous} {
		_, err := NewConsole(torn{takes}).Post(context.Background(), n)
		equal(t, "class", failure(err).Class, want)
		equal(t, "reason", err.Error(), "broken pipe")
	}
}
