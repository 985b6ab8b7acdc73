//go:build linux || darwin || freebsd || netbsd || openbsd || dragonfly

package hardware

import (
	"errors"
	"fmt"
	"os"
	"syscall"
)

var errHeld = errors.New("held by a running process")

// errCannotSync is what a file system says that cannot flush a folder.
var errCannotSync error = syscall.EINVAL

// lockFolder takes an exclusive lock on a folder, without waiting; it lasts until the file is closed or the
// process ends, however it ends. The path must still lead to the locked folder afterwards:
// otherwise the one that held it has just renamed or removed it, which counts as held.
func lockFolder(dir string) (*os.File, error) {
	f, err := os.Open(dir)
	if errors.Is(err, os.ErrNotExist) {
		return nil, errHeld
	}
	if err != nil {
		return nil, err
	}
	err = syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB)
	if errors.Is(err, syscall.EWOULDBLOCK) {
		f.Close()
		return nil, errHeld
	}
	if errors.Is(err, syscall.ENOLCK) || errors.Is(err, syscall.EOPNOTSUPP) || errors.Is(err, syscall.EBADF) {
		// A file system without locks: go on without, and never take a folder for stale.
		f.Close()
		return nil, nil
	}
	if err != nil {
		f.Close()
		return nil, fmt.Errorf("cannot lock: %w", err)
	}
	held, err1 := f.Stat()
	there, err2 := os.Lstat(dir)
	if err1 != nil || err2 != nil || !os.SameFile(held, there) {
		f.Close()
		return nil, errHeld
	}
	return f, nil
}
