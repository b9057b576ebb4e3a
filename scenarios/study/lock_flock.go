//go:build linux || darwin || freebsd || netbsd || openbsd || dragonfly

package study

import (
	"errors"
	"os"

	"golang.org/x/sys/unix"
)

// lock keeps a second program from writing to the same table. It goes with the
// file when that is closed, however the program ends. Where the file system has
// no locks there is none.
func lock(f *os.File) error {
	if err := unix.Flock(int(f.Fd()), unix.LOCK_EX|unix.LOCK_NB); errors.Is(err, unix.EWOULDBLOCK) {
		return errors.New("is being written by another run of this program")
	}
	return nil
}
