//go:build !linux

package health

import "time"

// monotonic is 0: no service manager of other systems asks for it.
func monotonic() (time.Duration, error) { return 0, nil }
