package health

import (
	"time"

	"golang.org/x/sys/unix"
)

// monotonic is CLOCK_MONOTONIC, which the service manager compares with its own reading.
func monotonic() (time.Duration, error) {
	var t unix.Timespec
	if err := unix.ClockGettime(unix.CLOCK_MONOTONIC, &t); err != nil {
		return 0, err
	}
	return time.Duration(t.Nano()), nil
}
