package desk

import (
	"fmt"
	"net"
	"os"
	"syscall"

	"strayd/rules"
)

// private says whether a folder belongs to this user and is closed to all others, save a group that may only enter.
func private(dir string) bool {
	info, err := os.Lstat(dir)
	if err != nil || !info.IsDir() {
		return false
	}
	st, ok := info.Sys().(*syscall.Stat_t)
	return ok && int(st.Uid) == os.Getuid() && info.Mode().Perm()&0o027 == 0
}

// peer is the user at the other end of a connection, as the kernel knows it.
func peer(c net.Conn) (rules.Person, error) {
	unix, ok := c.(*net.UnixConn)
	if !ok {
		return rules.Person{}, fmt.Errorf("connection %T is no socket", c)
	}
	raw, err := unix.SyscallConn()
	if err != nil {
		return rules.Person{}, err
	}
	var cred *syscall.Ucred
	var credErr error
	if err := raw.Control(func(fd uintptr) {
		cred, credErr = syscall.GetsockoptUcred(int(fd), syscall.SOL_SOCKET, syscall.SO_PEERCRED)
	}); err != nil {
		return rules.Person{}, err
	}
	if credErr != nil {
		return rules.Person{}, credErr
	}
	return PersonOf(int(cred.Uid)), nil
}
