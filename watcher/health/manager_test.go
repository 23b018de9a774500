package health

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"log/slog"
	"net"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"strings"
	"testing"
	"testing/synctest"
	"time"
)

// manager stands in for the service manager: it gives each datagram that it is sent.
func manager(t *testing.T, name string) func() string {
	t.Helper()
	conn, err := net.ListenUnixgram("unixgram", &net.UnixAddr{Name: name, Net: "unixgram"})
	if err != nil {
		t.Skipf("no datagram socket here: %v", err)
	}
	t.Cleanup(func() { conn.Close() })
	t.Setenv("NOTIFY_SOCKET", name)
	return func() string {
		t.Helper()
		buf := make([]byte, 4096)
		if err := conn.SetReadDeadline(time.Now().Add(20 * time.Second)); err != nil {
			t.Fatal(err)
		}
		n, err := conn.Read(buf)
		if err != nil {
			t.Fatal(err)
		}
		return string(buf[:n])
	}
}

func folder(t *testing.T) string {
	t.Helper()
	dir, err := os.MkdirTemp("", "health") // a socket's path must be short
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	return dir
}

// Each word is one datagram, as sd_notify(3) writes it.
func TestWordsToTheManager(t *testing.T) {
	said := manager(t, filepath.Join(folder(t), "notify"))
	for _, c := range []struct {
		say  func() error
		want string
	}{
		{Ready, "READY=1"},
		{Stopping, "STOPPING=1"},
		{func() error { return Status("pass 9: 3 files\nREADY=1\x1b[0m") }, "STATUS=pass 9: 3 files READY=1 [0m"},
		{func() error { return Notify("READY=1\nSTATUS=on") }, "READY=1\nSTATUS=on"},
	} {
		if err := c.say(); err != nil {
			t.Fatal(err)
		}
		if got := said(); got != c.want {
			t.Errorf("said %q, want %q", got, c.want)
		}
	}
}

func TestAbstractSocket(t *testing.T) {
	if runtime.GOOS != "linux" {
		t.Skip("abstract sockets need Linux")
	}
	said := manager(t, fmt.Sprintf("@strayd-test-%d", os.Getpid()))
	if err := Ready(); err != nil || said() != "READY=1" {
		t.Error(err)
	}
}

func TestNobodyToTell(t *testing.T) {
	t.Setenv("NOTIFY_SOCKET", "")
	for _, say := range []func() error{Ready, Reloading, Stopping} {
		if err := say(); err != nil {
			t.Error(err)
		}
	}
	t.Setenv("NOTIFY_SOCKET", "vsock:2:1234")
	if err := Ready(); err == nil || !strings.Contains(err.Error(), "vsock:2:1234") {
		t.Errorf("a socket of another kind: %v", err)
	}
	t.Setenv("NOTIFY_SOCKET", filepath.Join(folder(t), "gone"))
	if err := Ready(); err == nil || !strings.Contains(err.Error(), "gone") {
		t.Errorf("a socket that is not there: %v", err)
	}
}

// The time of a reload lies between two readings of the clock, which cannot be later than the machine's uptime.
func TestReloadingTellsTheTime(t *testing.T) {
	if runtime.GOOS != "linux" {
		t.Skip("the service manager that wants the time needs Linux")
	}
	said := manager(t, filepath.Join(folder(t), "notify"))
	before, _ := monotonic()
	if err := Reloading(); err != nil {
		t.Fatal(err)
	}
	after, _ := monotonic()
	var usec int64
	if n, err := fmt.Sscanf(said(), "RELOADING=1\nMONOTONIC_USEC=%d", &usec); n != 1 || err != nil {
		t.Fatal(err)
	}
	if usec < before.Microseconds() || usec > after.Microseconds() {
		t.Errorf("%d µs is not within %v and %v", usec, before, after)
	}
	text, err := os.ReadFile("/proc/uptime") // seconds since boot, those asleep included: proc_uptime(5)
	if err != nil {
		t.Skip(err)
	}
	var uptime float64
	if _, err := fmt.Sscan(string(text), &uptime); err != nil || usec <= 0 || float64(usec) > (uptime+1)*1e6 {
		t.Errorf("%d µs with an uptime of %v s, %v", usec, uptime, err)
	}
}

func TestWatchdogInterval(t *testing.T) {
	mine := fmt.Sprint(os.Getpid())
	for _, c := range []struct {
		usec, pid string
		want      time.Duration
		wrong     bool
	}{
		{"", "", 0, false},
		{"", mine, 0, false},
		{"120000000", "", time.Minute, false},
		{"120000000", mine, time.Minute, false},
		{"120000000", mine + "0", 0, false},
		{"120000000", "none", 0, false},
		{"1", "", 500 * time.Nanosecond, false},
		{"0", "", 0, true},
		{"-5", "", 0, true},
		{"2m", "", 0, true},
		{"9223372036854775807", "", 0, true}, // as nanoseconds it overflows
		{"9223372036854775", "", 9223372036854775 * time.Microsecond / 2, false},
	} {
		if got, err := signEvery(c.usec, c.pid); got != c.want || (err != nil) != c.wrong {
			t.Errorf("%q, %q: %v, %v, want %v", c.usec, c.pid, got, err, c.want)
		}
	}
}

func TestWatchdogTellsTheManager(t *testing.T) {
	said := manager(t, filepath.Join(folder(t), "notify"))
	t.Setenv("WATCHDOG_USEC", "2000")
	t.Setenv("WATCHDOG_PID", "")
	ctx, cancel := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	go func() { ended <- Watchdog(ctx, func() bool { return true }, nil) }()
	for range 3 {
		if got := said(); got != "WATCHDOG=1" {
			t.Errorf("said %q", got)
		}
	}
	cancel()
	if err := <-ended; err != nil {
		t.Error(err)
	}
	t.Setenv("WATCHDOG_USEC", "")
	if err := Watchdog(t.Context(), func() bool { panic("asked") }, nil); err != nil {
		t.Error(err)
	}
	t.Setenv("WATCHDOG_USEC", "soon")
	if err := Watchdog(t.Context(), func() bool { panic("asked") }, nil); err == nil || !strings.Contains(err.Error(), `"soon"`) {
		t.Errorf("a wrong interval: %v", err)
	}
}

// With a sign wanted every 2 minutes, one is given each minute in which there was progress, and none in any other.
func TestWatchdogKeepsStillWithoutProgress(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		ctx, cancel := context.WithTimeout(t.Context(), 10*time.Minute-time.Second)
		defer cancel()
		began := time.Now()
		minute := func() int { return int(time.Since(began).Minutes()) }
		progress := map[int]bool{1: true, 2: true, 5: true, 6: true, 8: true}
		lost := map[int]bool{6: true} // the sign does not get through, and the next one is tried all the same
		var signs []int
		var log bytes.Buffer
		watch(ctx, time.Minute, func() bool { return progress[minute()] }, func() error {
			signs = append(signs, minute())
			if lost[minute()] {
				return errors.New("nobody there")
			}
			return nil
		}, slog.New(slog.NewTextHandler(&log, nil)))
		if want := []int{1, 2, 5, 6, 8}; !reflect.DeepEqual(signs, want) {
			t.Errorf("signs in the minutes %v, want %v", signs, want)
		}
		if silent, failed := strings.Count(log.String(), "no progress"), strings.Count(log.String(), "nobody there"); silent != 4 || failed != 1 {
			t.Errorf("the log has %d silences, want 4, and %d failures, want 1", silent, failed)
		}
	})
}
