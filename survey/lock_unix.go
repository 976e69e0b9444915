//go:build darwin || dragonfly || freebsd || linux || netbsd || openbsd

package survey

import (
	"errors"
	"os"
	"syscall"
)

// flock locks a file without waiting; false where another process holds it. The
// system lets go of it when the process ends, however it ends.
func flock(f *os.File) (bool, error) {
	for {
		switch err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB); {
		case err == nil:
			return true, nil
		case errors.Is(err, syscall.EINTR):
		case errors.Is(err, syscall.EWOULDBLOCK):
			return false, nil
		default:
			return false, err
		}
	}
}
