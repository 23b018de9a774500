package health

import _ "embed" // for the unit

//go:embed strayd.service
var unit string

// Unit is a commented systemd unit that runs the daemon with as few rights as it needs.
func Unit() string { return unit }
