package health

import (
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"net/http"
	"net/netip"
	"strconv"
	"strings"
	"time"
)

// stopTime is how long requests in progress may take once the daemon stops.
const stopTime = 3 * time.Second

// CheckAddress refuses an address that Listen refuses whatever the machine: one that is not host:port with a loopback host
// (127.0.0.0/8, ::1 or localhost) and a number for a port.
func CheckAddress(addr string) error {
	host, port, err := net.SplitHostPort(addr)
	if err != nil {
		return fmt.Errorf("address %q is not host:port, such as 127.0.0.1:9190", addr)
	}
	if _, err := strconv.ParseUint(port, 10, 16); err != nil {
		return fmt.Errorf("address %q: the port must be a number of at most 65535", addr)
	}
	if strings.EqualFold(host, "localhost") {
		return nil
	}
	if ip, err := netip.ParseAddr(host); err != nil || !ip.Unmap().IsLoopback() {
		return fmt.Errorf("address %q: the host must be a loopback address (127.0.0.1, ::1 or localhost), so that no other machine reaches it", addr)
	}
	return nil
}

// Listen listens on a loopback address, and on nothing else even where the machine's tables say that localhost is elsewhere.
func Listen(addr string) (net.Listener, error) {
	if err := CheckAddress(addr); err != nil {
		return nil, err
	}
	l, err := net.Listen("tcp", addr)
	if err != nil {
		return nil, fmt.Errorf("address %q: %w", addr, err)
	}
	if tcp, ok := l.Addr().(*net.TCPAddr); !ok || !tcp.IP.IsLoopback() {
		l.Close()
		return nil, fmt.Errorf("address %q is %v here, which is no loopback address", addr, l.Addr())
	}
	return l, nil
}

// Serve answers on a listener until the context ends, then lets requests in progress end for 3 seconds and cuts off the rest.
// It closes the listener, and returns nil after the context ended. log is told of trouble with connections; nobody when nil.
func Serve(ctx context.Context, l net.Listener, h http.Handler, log *slog.Logger) error {
	if log == nil {
		log = slog.New(slog.DiscardHandler)
	}
	s := &http.Server{
		Handler:                      h,
		ReadHeaderTimeout:            5 * time.Second,
		ReadTimeout:                  10 * time.Second,
		WriteTimeout:                 2 * answerTime,
		IdleTimeout:                  time.Minute,
		MaxHeaderBytes:               16 << 10,
		DisableGeneralOptionsHandler: true,
		ErrorLog:                     slog.NewLogLogger(log.Handler(), slog.LevelWarn),
	}
	stopped := make(chan struct{})
	running := context.AfterFunc(ctx, func() { defer close(stopped); stop(s) })
	err := s.Serve(l)
	if !running() {
		<-stopped
	}
	if errors.Is(err, http.ErrServerClosed) {
		return nil
	}
	return fmt.Errorf("health pages: %w", err)
}

// stop ends a server. Its deadline begins now, after the signal, or requests in progress would have no time at all.
func stop(s *http.Server) {
	ctx, cancel := context.WithTimeout(context.Background(), stopTime)
	defer cancel()
	if s.Shutdown(ctx) != nil {
		s.Close()
	}
}
