package desk

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"net"
	"os"
	"os/user"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"

	"strayd/rules"
)

// begin starts a server for an invented ledger path in a private folder.
func begin(t *testing.T, run func(ctx context.Context, call Call, stdout, stderr io.Writer) int) (ledger string, s *Server) {
	t.Helper()
	if runtime.GOOS != "linux" {
		t.Skip("the control socket needs Linux")
	}
	dir, err := os.MkdirTemp("", "desk")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	t.Setenv("RUNTIME_DIRECTORY", dir)
	ledger = filepath.Join(dir, "ledger.db")
	s = &Server{Run: run, Log: slog.New(slog.NewTextHandler(io.Discard, nil))}
	if err := s.Listen(ledger); err != nil {
		t.Fatal(err)
	}
	served := make(chan error, 1)
	go func() { served <- s.Serve() }()
	t.Cleanup(func() {
		s.Close(5 * time.Second)
		if err := <-served; err != nil {
			t.Error(err)
		}
	})
	return ledger, s
}

func TestOutputAndExitCodeComeBackInOrder(t *testing.T) {
	ledger, _ := begin(t, func(_ context.Context, call Call, stdout, stderr io.Writer) int {
		fmt.Fprintf(stdout, "%v in %s under %s\n", call.Args, call.Dir, call.Settings)
		fmt.Fprintln(stderr, "a word")
		return 3
	})
	var out, errs bytes.Buffer
	exit, err := Do(t.Context(), ledger, Call{Args: []string{"flags", "--all"}, Dir: "/somewhere", Settings: "h"}, &out, &errs)
	if err != nil || exit != 3 || out.String() != "[flags --all] in /somewhere under h\n" || errs.String() != "a word\n" {
		t.Errorf("exit %d, %v, %q, %q", exit, err, out.String(), errs.String())
	}
}

// More output than is kept in memory arrives whole.
func TestLargeOutput(t *testing.T) {
	line := strings.Repeat("x", 999) + "\n"
	ledger, _ := begin(t, func(_ context.Context, _ Call, stdout, _ io.Writer) int {
		for range 20_000 {
			io.WriteString(stdout, line)
		}
		return 0
	})
	var out bytes.Buffer
	if _, err := Do(t.Context(), ledger, Call{}, &out, io.Discard); err != nil || out.String() != strings.Repeat(line, 20_000) {
		t.Errorf("%v, %d bytes", err, out.Len())
	}
}

func TestWhoIsThePeerNotWhatTheCallSays(t *testing.T) {
	ledger, _ := begin(t, func(_ context.Context, call Call, stdout, _ io.Writer) int {
		io.WriteString(stdout, call.Who.String())
		return 0
	})
	var out bytes.Buffer
	if _, err := Do(t.Context(), ledger, Call{Who: rules.Person{UID: 4711, Name: "somebody-else"}}, &out, io.Discard); err != nil {
		t.Fatal(err)
	}
	me, err := user.Current()
	if err != nil {
		t.Fatal(err)
	}
	if want := fmt.Sprintf("%s (uid %d)", me.Username, os.Getuid()); out.String() != want {
		t.Errorf("the call is said to come from %q, not %q", out.String(), want)
	}
}

// A caller that hangs up ends its command.
func TestHangUpEndsTheCommand(t *testing.T) {
	began, ended := make(chan bool), make(chan bool)
	ledger, _ := begin(t, func(ctx context.Context, _ Call, _, _ io.Writer) int {
		close(began)
		<-ctx.Done()
		close(ended)
		return 0
	})
	ctx, cancel := context.WithCancel(t.Context())
	go func() { <-began; cancel() }()
	if _, err := Do(ctx, ledger, Call{}, io.Discard, io.Discard); err == nil {
		t.Error("no error for a command that was given up")
	}
	<-ended
}

// A socket file that a killed process left is no daemon, and the next daemon takes its place.
func TestStaleSocket(t *testing.T) {
	ledger, _ := begin(t, func(context.Context, Call, io.Writer, io.Writer) int { return 0 })
	other := ledger + "-other"
	path := filepath.Join(filepath.Dir(ledger), name(other))
	l, err := net.Listen("unix", path)
	if err != nil {
		t.Fatal(err)
	}
	l.(*net.UnixListener).SetUnlinkOnClose(false)
	l.Close()
	if _, err := Do(t.Context(), other, Call{}, io.Discard, io.Discard); !errors.Is(err, ErrNobody) {
		t.Errorf("a stale socket gives %v", err)
	}
	s := &Server{Run: func(context.Context, Call, io.Writer, io.Writer) int { return 7 }, Log: slog.New(slog.NewTextHandler(io.Discard, nil))}
	if err := s.Listen(other); err != nil {
		t.Fatal(err)
	}
	go s.Serve() //nolint:errcheck // ended by Close
	defer s.Close(time.Second)
	if exit, err := Do(t.Context(), other, Call{}, io.Discard, io.Discard); exit != 7 || err != nil {
		t.Errorf("exit %d, %v", exit, err)
	}
}

func TestNobodyAndOpenFolder(t *testing.T) {
	ledger, _ := begin(t, func(context.Context, Call, io.Writer, io.Writer) int { return 0 })
	if _, err := Do(t.Context(), ledger+"x", Call{}, io.Discard, io.Discard); !errors.Is(err, ErrNobody) {
		t.Errorf("no socket gives %v", err)
	}
	open := filepath.Join(filepath.Dir(ledger), "open")
	if err := os.Mkdir(open, 0o700); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(open, 0o777); err != nil {
		t.Fatal(err)
	}
	if private(open) {
		t.Error("a folder that everyone may write to counts as private")
	}
}

// A folder of the last resort's name that another user could have made is nobody's.
func TestLastResortIsOnesOwn(t *testing.T) {
	begin(t, func(context.Context, Call, io.Writer, io.Writer) int { return 0 })
	t.Setenv("TMPDIR", os.Getenv("RUNTIME_DIRECTORY"))
	if err := os.Mkdir(lastResort(), 0o700); err != nil {
		t.Fatal(err)
	}
	l, err := net.Listen("unix", filepath.Join(lastResort(), name("x")))
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	for mode, want := range map[os.FileMode]bool{0o700: true, 0o777: false} {
		if err := os.Chmod(lastResort(), mode); err != nil {
			t.Fatal(err)
		}
		if _, there := Path("x"); there != want {
			t.Errorf("with mode %v the socket counts: %v", mode, there)
		}
	}
}
