//go:build !(linux || darwin || freebsd || netbsd || openbsd || dragonfly)

package hardware

import (
	"errors"
	"io/fs"
	"os"
)

var errHeld = errors.New("held by a running process")

// errCannotSync is what a system says that cannot open a folder to flush it.
var errCannotSync error = fs.ErrPermission

// lockFolder has no lock to take on this system: part folders of killed runs stay where they are.
func lockFolder(string) (*os.File, error) { return nil, nil }
