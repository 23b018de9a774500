package desk

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"log/slog"
	"net"
	"os"
	"path/filepath"
	"sync"
	"time"
)

// Server takes calls on the control socket.
type Server struct {
	// Run carries out one call and gives its exit code. Many may run at once.
	Run func(ctx context.Context, call Call, stdout, stderr io.Writer) int
	Log *slog.Logger

	listener net.Listener
	path     string
	calls    sync.WaitGroup
	cancel   context.CancelFunc
	ctx      context.Context
	most     chan struct{}
}

const (
	// atOnce is how many calls run at the same time; others wait.
	atOnce = 16
	// callTime is how long a caller may take to say what it wants.
	callTime = 30 * time.Second
	// largestCall bounds a command line, in bytes.
	largestCall = 1 << 20
)

// Listen opens the socket of a ledger. The caller holds the ledger, so that a socket that is there already is stale.
func (s *Server) Listen(ledger string) error {
	dir, err := serverFolder()
	if err != nil {
		return err
	}
	s.path = filepath.Join(dir, name(ledger))
	if len(s.path) > longestPath {
		return fmt.Errorf("control socket %s: the path has %d bytes, more than %d; set RUNTIME_DIRECTORY to a shorter folder", s.path, len(s.path), longestPath)
	}
	if err := os.Remove(s.path); err != nil && !errors.Is(err, os.ErrNotExist) {
		return err
	}
	if s.listener, err = net.Listen("unix", s.path); err != nil {
		return fmt.Errorf("control socket: %w", err)
	}
	s.ctx, s.cancel = context.WithCancel(context.Background())
	s.most = make(chan struct{}, atOnce)
	return os.Chmod(s.path, 0o660)
}

// Serve takes calls until Close.
func (s *Server) Serve() error {
	for {
		conn, err := s.listener.Accept()
		if errors.Is(err, net.ErrClosed) {
			return nil
		}
		if err != nil {
			return fmt.Errorf("control socket: %w", err)
		}
		s.calls.Go(func() {
			defer conn.Close()
			defer context.AfterFunc(s.ctx, func() { conn.Close() })()
			if err := s.call(conn); err != nil && s.ctx.Err() == nil {
				s.Log.Warn("a command on the control socket went wrong", "error", err)
			}
		})
	}
}

// Close takes no more calls, ends those that run and waits for them, at most for the given time.
func (s *Server) Close(wait time.Duration) {
	s.listener.Close()
	s.cancel()
	done := make(chan struct{})
	go func() { s.calls.Wait(); close(done) }()
	select {
	case <-done:
	case <-time.After(wait):
	}
}

// call carries out one call. Its output is kept until it has ended, so that nothing of the ledger stays open while it is sent.
func (s *Server) call(conn net.Conn) error {
	who, err := peer(conn)
	if err != nil {
		return err
	}
	if err := conn.SetDeadline(time.Now().Add(callTime)); err != nil {
		return err
	}
	var call Call
	if err := json.NewDecoder(io.LimitReader(conn, largestCall)).Decode(&call); err != nil {
		return fmt.Errorf("call: %w", err)
	}
	if err := conn.SetDeadline(time.Time{}); err != nil {
		return err
	}
	call.Who = who
	out := &spool{}
	defer out.close()
	exit := 2
	if call.Version != protocol {
		fmt.Fprintf(out.stderr(), "strayd: the running daemon is of another version (protocol %d, this command's %d): restart it\n", protocol, call.Version)
	} else if exit, err = s.run(conn, call, out); err != nil {
		return err
	}
	return out.send(conn, exit)
}

// run waits for its turn and carries the call out; a caller that hangs up ends it.
func (s *Server) run(conn net.Conn, call Call, out *spool) (int, error) {
	ctx, cancel := context.WithCancel(s.ctx)
	defer cancel()
	go func() { // the caller sends nothing more: any end of its side means that it has gone
		bufio.NewReader(conn).ReadByte() //nolint:errcheck // only the fact matters
		cancel()
	}()
	select {
	case s.most <- struct{}{}:
		defer func() { <-s.most }()
	case <-ctx.Done():
		return 0, ctx.Err()
	}
	return s.Run(ctx, call, out.stdout(), out.stderr()), nil
}
