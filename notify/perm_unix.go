//go:build unix

package notify

import (
	"io/fs"
	"os"
	"syscall"
)

// othersMay is the permission bits that a secret's file must not have. A credential that the service manager owns and lets us read
// by an access list shows that list's mask in the group's place.
func othersMay(info fs.FileInfo, credential bool) fs.FileMode {
	stat, ok := info.Sys().(*syscall.Stat_t)
	if credential && ok && int(stat.Uid) != os.Geteuid() {
		return 0o037
	}
	return 0o077
}
