//go:build unix

package ledger

import (
	"os"
	"syscall"
)

// Owner is the uid of the user to whom a ledger's file belongs; ok is false where that cannot be known.
func Owner(path string) (uid int, ok bool) {
	info, err := os.Stat(path)
	if err != nil {
		return 0, false
	}
	st, ok := info.Sys().(*syscall.Stat_t)
	if !ok {
		return 0, false
	}
	return int(st.Uid), true
}
