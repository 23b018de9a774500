package feed

import (
	"fmt"
	"io/fs"
	"syscall"
)

// stamp knows a file again without reading it: device, inode, size, and the times of the last change of content and of inode. The
// last one cannot be set by a program.
func stamp(info fs.FileInfo) string {
	s, ok := info.Sys().(*syscall.Stat_t)
	if !ok {
		return ""
	}
	return fmt.Sprintf("%d:%d:%d:%d.%09d:%d.%09d", s.Dev, s.Ino, s.Size, s.Mtim.Sec, s.Mtim.Nsec, s.Ctim.Sec, s.Ctim.Nsec)
}
