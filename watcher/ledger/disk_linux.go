package ledger

import (
	"fmt"

	"golang.org/x/sys/unix"
)

// localDisk refuses a folder on a file system whose locks or memory maps are not to be trusted. Magic numbers: statfs(2).
func localDisk(dir string) error {
	var s unix.Statfs_t
	if unix.Statfs(dir, &s) != nil {
		return nil // whatever is wrong shows on opening
	}
	if name := remoteName(uint32(s.Type)); name != "" {
		return fmt.Errorf("folder %s lies on %s: %w", dir, name, ErrFilesystem)
	}
	return nil
}

func remoteName(magic uint32) string {
	switch magic {
	case unix.NFS_SUPER_MAGIC:
		return "NFS"
	case unix.SMB_SUPER_MAGIC, unix.SMB2_SUPER_MAGIC, unix.CIFS_SUPER_MAGIC:
		return "SMB"
	case unix.FUSE_SUPER_MAGIC:
		return "FUSE"
	case unix.V9FS_MAGIC:
		return "9p"
	}
	return ""
}
