package health

import (
	"context"
	"fmt"
	"log/slog"
	"net"
	"os"
	"strconv"
	"strings"
	"time"
)

// notifyTime bounds how long the service manager may take to take a word.
const notifyTime = 5 * time.Second

// Notify tells the service manager something, as sd_notify(3) writes it: one datagram to the socket that NOTIFY_SOCKET names.
// Without that variable nobody is to be told, and nothing happens.
func Notify(state string) error {
	socket := os.Getenv("NOTIFY_SOCKET")
	if socket == "" {
		return nil
	}
	if socket[0] != '/' && socket[0] != '@' { // @ stands for the NUL byte of an abstract socket
		return fmt.Errorf("service manager: NOTIFY_SOCKET %q is neither a path nor an abstract socket", socket)
	}
	conn, err := net.DialUnix("unixgram", nil, &net.UnixAddr{Name: socket, Net: "unixgram"})
	if err != nil {
		return fmt.Errorf("service manager: %w", err)
	}
	defer conn.Close()
	if err := conn.SetWriteDeadline(time.Now().Add(notifyTime)); err != nil {
		return fmt.Errorf("service manager: %w", err)
	}
	if _, err := conn.Write([]byte(state)); err != nil {
		return fmt.Errorf("service manager: %w", err)
	}
	return nil
}

// Ready says that the daemon has started, or that a reload has ended, well or not.
func Ready() error { return Notify("READY=1") }

// Stopping says that the daemon has begun to stop.
func Stopping() error { return Notify("STOPPING=1") }

// Status says in one line, for `systemctl status`, what the daemon is doing.
func Status(text string) error {
	return Notify("STATUS=" + strings.Join(strings.Fields(oneLine(text)), " "))
}

// Reloading says that the daemon has begun to read its configuration again. Ready must follow.
func Reloading() error {
	now, err := monotonic()
	if err != nil {
		return fmt.Errorf("service manager: monotonic clock: %w", err)
	}
	return Notify("RELOADING=1\nMONOTONIC_USEC=" + strconv.FormatInt(now.Microseconds(), 10))
}

// Watchdog tells the service manager, at half the interval that it asks for, that the daemon gets on, until the context ends; it
// returns at once when no such sign is asked for. progressed says whether there was progress since it was last called: without
// any, nothing is said, and in the end the manager ends the daemon and starts it anew. log is told of silence and of signs that
// did not get through; nobody when nil.
func Watchdog(ctx context.Context, progressed func() bool, log *slog.Logger) error {
	every, err := signEvery(os.Getenv("WATCHDOG_USEC"), os.Getenv("WATCHDOG_PID"))
	if err != nil || every == 0 {
		return err
	}
	if log == nil {
		log = slog.New(slog.DiscardHandler)
	}
	watch(ctx, every, progressed, func() error { return Notify("WATCHDOG=1") }, log)
	return nil
}

func watch(ctx context.Context, every time.Duration, progressed func() bool, ping func() error, log *slog.Logger) {
	tick := time.NewTicker(every)
	defer tick.Stop()
	for {
		select {
		case <-ctx.Done():
			return
		case <-tick.C:
		}
		if !progressed() {
			log.Warn("no progress since the last sign to the watchdog, so none is given", "interval", every)
		} else if err := ping(); err != nil {
			log.Warn("the watchdog was not told of progress", "error", err)
		}
	}
}

// signEvery is half the time within which the manager wants a sign, from its two variables; 0 when it wants none of this process.
// The process may be left out, and then every one is meant: sd_watchdog_enabled(3).
func signEvery(usec, pid string) (time.Duration, error) {
	if usec == "" {
		return 0, nil
	}
	if pid != "" && pid != strconv.Itoa(os.Getpid()) {
		return 0, nil
	}
	n, err := strconv.ParseInt(usec, 10, 64)
	if err != nil || n <= 0 || n > int64(time.Duration(1<<63-1)/time.Microsecond) {
		return 0, fmt.Errorf("service manager: WATCHDOG_USEC %q is no number of microseconds", usec)
	}
	return time.Duration(n) * time.Microsecond / 2, nil
}
